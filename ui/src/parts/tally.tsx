// One stroke a setpoint, in the order of the plan: tall ink measured, short pencil to come,
// hollow head flagged, cross lost, accent wedge now; uprights part the supplies.
import { useMemo } from "preact/hooks";
import { count, format } from "../data/format";
import { flagged, type Point, type Setpoint } from "../data/nouns";
import { useWidth } from "./width";

export interface TallyProps { setpoints: readonly Setpoint[]; points: readonly Point[]; now: number | null; over: boolean }

type Mark = "measured" | "flagged" | "lost" | "coming";

/** What stands for each setpoint. Lost: passed by, and something later was measured, or the run is over with a later point. */
export function marks(setpoints: readonly Setpoint[], points: readonly Point[]): Mark[] {
  const byIndex = new Map(points.map((p) => [p.setpoint.index, p]));
  const last = setpoints.reduce((a, s, i) => (byIndex.has(s.index) ? i : a), -1);
  return setpoints.map((s, i) => {
    const p = byIndex.get(s.index);
    if (p) return flagged(p) ? "flagged" : "measured";
    return i < last ? "lost" : "coming";
  });
}

export function Tally({ setpoints, points, now, over }: TallyProps) {
  const [box, width] = useWidth<HTMLDivElement>(1312);
  const drawn = useMemo(() => draw({ setpoints, points, now, over }, width), [setpoints, points, now, over, width]);
  return <div class="tallybox" ref={box}>{drawn}</div>;
}

function draw({ setpoints, points, now, over }: TallyProps, width: number) {
  const all = marks(setpoints, points);
  const n = { flagged: all.filter((m) => m === "flagged").length, lost: all.filter((m) => m === "lost").length };
  const step = (width - 1) / Math.max(all.length, 1);
  const x = (i: number) => Math.round((i * step + step / 2) * 10) / 10;
  const label = `${points.length} of ${count(all.length, "point")}. ${n.flagged} flagged, ${n.lost} lost`;
  const at = now === null || over ? -1 : setpoints.findIndex((s) => s.index === now);
  const parts = setpoints.flatMap((s, i) => (i === 0 || s.supply_voltage !== setpoints[i - 1]!.supply_voltage ? [{ s, i }] : []));
  return (
    <svg class="fig tally" width={width} height={36} viewBox={`0 0 ${width} 36`} role="img" aria-label={label}>
      <path class="tl" d={strokes(all, "measured", x, 4) + strokes(all, "flagged", x, 8)} />
      <path class="tp" d={strokes(all, "coming", x, 12)} />
      <path class="lostm" d={all.map((m, i) => (m === "lost" ? `M${x(i) - 2.5} 7l5 6m0 -6l-5 6` : "")).join("")} />
      {all.map((m, i) => m === "flagged" && <circle key={i} class="pth" cx={x(i)} cy={5} r={2.1} />)}
      <path class="tbase" d={`M0 16H${width}`} />
      <path class="tsep" d={parts.map(({ i }) => `M${Math.max(0.4, i * step)} 1V20`).join("") + `M${width - 0.5} 1V20`} />
      {at >= 0 && <path class="nowt" d={`M${x(at)} 17l-4 4.5h8z`} />}
      {parts.map(({ s, i }, k) => (room(parts, k, step, width) ? <text key={i} class="num" x={i * step} y={32}>{format(s.supply_voltage, "V", 3)}</text> : null))}
    </svg>
  );
}

function strokes(all: readonly Mark[], which: Mark, x: (i: number) => number, top: number): string {
  return all.map((m, i) => (m === which ? `M${x(i)} ${top}V16` : "")).join("");
}

// A supply is named where the next one leaves room for its name.
function room(parts: readonly { i: number }[], k: number, step: number, width: number): boolean {
  const next = parts[k + 1] ? parts[k + 1]!.i * step : width;
  return next - parts[k]!.i * step > 34;
}

/** A night in the list of runs: only how far it came is known there, not which points are flagged. */
export function MiniTally({ planned, measured }: { planned: number; measured: number }) {
  const [box, width] = useWidth<HTMLDivElement>(560);
  if (!planned) return null;
  const step = (width - 1) / planned;
  const x = (i: number) => Math.round((i * step + step / 2) * 10) / 10;
  const stroke = (from: number, to: number, top: number) => Array.from({ length: Math.max(0, to - from) }, (_, i) => `M${x(from + i)} ${top}V16`).join("");
  return (
    <div class="tallybox" ref={box}>
      <svg class="fig tally mini" width={width} height={20} viewBox={`0 0 ${width} 20`} role="img" aria-label={`${measured} of ${count(planned, "point")}`}>
        <path class="tl" d={stroke(0, measured, 5)} />
        <path class="tp" d={stroke(measured, planned, 12)} />
        <path class="tbase" d={`M0 16H${width}`} />
        <path class="tsep" d={`M0.4 2V19M${width - 0.5} 2V19`} />
      </svg>
    </div>
  );
}
