// The newest record: one line in ink, its levels named at the right, its times on brackets.
import { useMemo } from "preact/hooks";
import { clockSeconds, count, format, formatU, nbsp, tidy } from "../data/format";
import { type Point, reading, type Wave, type Waveforms } from "../data/nouns";
import { labelWidth, spread } from "./place";
import { linear, ticks } from "./scale";
import { type Level, levels, outline, twoPeriods, volts } from "./wave";
import { useWidth } from "./width";

export interface TraceProps { record: Waveforms; point: Point | null }

const top = 24;

export function Trace({ record, point }: TraceProps) {
  const [box, width] = useWidth<HTMLElement>();
  const drawn = useMemo(() => draw({ record, point }, width), [record, point, width]);
  return <figure ref={box}>{drawn}</figure>;
}

function draw({ record, point }: TraceProps, width: number) {
  const w = record.records[0];
  if (!w || w.codes.length < 2) return null;
  const narrow = width < 600;
  const [left, right, bottom] = [narrow ? 34 : 40, width - (narrow ? 92 : 140), top + 180];
  const found = levels(w);
  const win = twoPeriods(w, found);
  const shown = w.codes.slice(win.from, win.to + 1);
  const named = nameLevels(found, point);
  const [lo, hi] = [Math.min(0, ...shown.map((c) => volts(w, c))), Math.max(...shown.map((c) => volts(w, c)))];
  const x = linear(win.from, win.to, left, right);
  const y = linear(lo - (hi - lo) * 0.05, hi + (hi - lo) * 0.05, bottom, top);
  const height = bottom + 62;
  const labels = spread(named.map((l) => y(l.volts)), 34);
  return (
    <>
      <svg class="fig" width={width} height={height} viewBox={`0 0 ${width} ${height}`} role="img" aria-label={`${w.node}: ${named.map((l) => `${l.name} ${l.words}`).join(", ")}.`}>
        <text class="cap" x={0} y={13}>{w.node}, V</text>
        {ticks(lo, hi, 4).map((t) => <g key={t}><text class="num" x={left - 8} y={y(t) + 4} text-anchor="end">{tidy(String(t))}</text><path class="brk" d={`M${left - 4} ${y(t)}h4`} /></g>)}
        {named.map((l, i) => (
          <g key={l.name}>
            <path class="level" d={`M${left} ${y(l.volts)}H${right + 4}`} />
            <text class="lab strong" x={right + 10} y={labels[i]! - 2}>{l.name}</text>
            <text class="num" x={right + 10} y={labels[i]! + 13}>{l.words}</text>
          </g>
        ))}
        <path class="trace" d={outline(w.codes, win.from, win.to, x, (c) => y(volts(w, c)))} />
        {point && win.first !== null && <Times w={w} point={point} first={win.first} x={x} y={bottom + 14} right={right} />}
      </svg>
      <figcaption>{says(w, record, win.periods, named)}</figcaption>
    </>
  );
}

interface Named extends Level { words: string; measured: boolean }

// A level measured at this point keeps its uncertainty; one only read off the record is said to be about that.
function nameLevels(found: Level[], point: Point | null): Named[] {
  const roads: Record<string, string> = { high: "high_level", driven: "high_level", low: "low_level", freewheel: "low_level", rest: "back_emf" };
  return found.map((l) => {
    const r = point && reading(point, roads[l.name] ?? "");
    const near = r && r.value !== null && Math.abs(r.value - l.volts) < 0.5;
    return { ...l, words: near ? formatU(r.value!, r.u, r.unit) : `about ${tidy(l.volts.toFixed(2))}${nbsp}V`, measured: !!near };
  });
}

function Times({ w, point, first, x, y, right }: { w: Wave; point: Point; first: number; x: (i: number) => number; y: number; right: number }) {
  const f = reading(point, "frequency");
  const duty = reading(point, "duty");
  if (!f || !f.value) return null;
  const period = 1 / f.value / w.interval; // in samples
  const [a, b] = [x(first), x(first + period)];
  if (b > right + 8) return null;
  const high = duty?.value ? x(first + period * duty.value) : null;
  const u = f.u === null ? null : f.u / f.value ** 2;
  const words = `one period ${formatU(1 / f.value, u, "s")}` + (duty && duty.value !== null ? `, duty ${formatU(duty.value, duty.u, "1")}` : "");
  const mid = Math.max((a + b) / 2, labelWidth(words) / 2);
  return (
    <g>
      <path class="brk" d={bracket(a, b, y + 22) + (high ? bracket(a, high, y) : "")} />
      {high && <text class="num" x={Math.max((a + high) / 2, 40)} y={y + 16} text-anchor="middle">high {format(duty!.value! / f.value, "s", 3)}</text>}
      <text class="num" x={mid} y={y + 40} text-anchor="middle">{words}</text>
    </g>
  );
}

function bracket(a: number, b: number, y: number): string {
  return `M${a} ${y - 4}v4H${b}v-4`;
}

function says(w: Wave, record: Waveforms, periods: number, named: Named[]): string {
  const of = periods > 2 ? `Two of ${periods} whole periods` : periods > 0 ? count(periods, "whole period") : `${format(w.codes.length * w.interval, "s", 3)} of it`;
  const about = named.some((l) => !l.measured) ? " “About” is read off this record, without an uncertainty." : "";
  return `${of}, taken at ${clockSeconds(record.at)}: ${w.node}.${about}`;
}
