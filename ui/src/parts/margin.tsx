// The margin: the log, newest first, times hanging beside sentences.
import { clock, clockSeconds } from "../data/format";
import type { Line } from "../data/night";
import { flagged } from "../data/nouns";
import { pointWords, sentence } from "../data/words";
import { Flags } from "./flags";

export interface LogProps { lines: readonly Line[]; now?: string; nowAt?: string; most: number; all?: string }

export function Log({ lines, now, nowAt, most, all }: LogProps) {
  const shown = withSupply(lines.slice(-most)).reverse();
  return (
    <>
      <h2>Log</h2>
      <ol class="log" reversed>
        {now && <li class="now"><time>{nowAt ? clock(nowAt) : ""}</time><span>{now}</span></li>}
        {shown.map(({ l, same }) => <LogLine key={l.seq} l={l} same={same} />)}
      </ol>
      {lines.length > most && all && <p class="noprint"><a href={all}>The whole log</a></p>}
      {!lines.length && !now && <p class="sub">Nothing yet.</p>}
    </>
  );
}

const evidence = new Set(["off", "trip", "energising", "ended"]);

/** Whether the point before stood at the same supply, so that its name need not be said again. */
function withSupply(lines: readonly Line[]): { l: Line; same: boolean }[] {
  let supply = NaN;
  return lines.map((l) => {
    const v = l.point?.setpoint.supply_voltage ?? supply;
    const same = v === supply;
    supply = v;
    return { l, same };
  });
}

function LogLine({ l, same }: { l: Line; same: boolean }) {
  return (
    <li>
      <time dateTime={l.at}>{evidence.has(l.kind) ? clockSeconds(l.at) : clock(l.at)}</time>
      <span>{l.point ? <PointLine l={l} same={same} /> : sentence(l.words)}</span>
    </li>
  );
}

function PointLine({ l, same }: { l: Line; same: boolean }) {
  const p = l.point!;
  if (!flagged(p)) return <>{pointWords(p, same)}</>;
  return <>{pointWords(p, same)}<Flags of={p} />.</>;
}
