// A raw record, made fit to draw: volts, levels, a window of whole periods, one column a pixel. Pure.
import type { Wave } from "../data/nouns";

export function volts(w: Wave, code: number): number {
  return code * w.volts_per_code + w.volts_at_zero;
}

export interface Level { name: string; volts: number }

/**
 * The plateaus of a record: peaks of the histogram of codes (the two-level method of IEEE 181,
 * with a third level where a motor rests), each the mean of its bin and neighbours.
 */
export function levels(w: Wave): Level[] {
  const { codes } = w;
  let [lo, hi] = [Infinity, -Infinity];
  for (const c of codes) [lo, hi] = [Math.min(lo, c), Math.max(hi, c)];
  if (!(hi > lo)) return codes.length ? [{ name: "constant", volts: volts(w, lo) }] : [];
  const bins = 64;
  const n = new Array<number>(bins).fill(0);
  const sum = new Array<number>(bins).fill(0);
  for (const c of codes) {
    const b = Math.min(bins - 1, Math.floor(((c - lo) / (hi - lo)) * bins));
    n[b]!++;
    sum[b]! += c;
  }
  const at = (from: number, to: number) => peak(n, sum, from, to, codes.length);
  const low = at(0, bins / 3);
  const rest = at(bins / 3 + 1, (bins * 5) / 6 - 4);
  const high = at((bins * 5) / 6 - 4, bins);
  const found: [string, number | null][] = rest === null ? [["high", high], ["low", low]] : [["driven", high], ["rest", rest], ["freewheel", low]];
  return found.flatMap(([name, code]) => (code === null ? [] : [{ name, volts: volts(w, code) }]));
}

// The fullest bin of a stretch with its neighbours; null when less than 4 % of the record stands there.
function peak(n: number[], sum: number[], from: number, to: number, total: number): number | null {
  const [a, b] = [Math.floor(from), Math.floor(to)];
  let best = a;
  for (let i = a; i < b; i++) if (n[i]! > n[best]!) best = i;
  let [count, codes] = [0, 0];
  for (let i = Math.max(0, best - 1); i <= Math.min(n.length - 1, best + 1); i++) [count, codes] = [count + n[i]!, codes + sum[i]!];
  return count < 0.04 * total ? null : codes / count;
}

/**
 * Instants (sample numbers, interpolated) where the record rises half way to its highest level
 * from the level below: with a resting motor that is above the rest, not the middle of the range.
 */
export function rises(w: Wave, found: readonly Level[] = levels(w)): number[] {
  const { codes } = w;
  const code = (v: number) => (v - w.volts_at_zero) / w.volts_per_code;
  const [top, next] = found.map((l) => code(l.volts));
  if (top === undefined || next === undefined) return [];
  const [mid, hold] = [(top + next) / 2, (top - next) / 8];
  const out: number[] = [];
  let armed = false;
  for (let i = 1; i < codes.length; i++) {
    const [a, b] = [codes[i - 1]!, codes[i]!];
    if (b < mid - hold) armed = true;
    if (armed && a < mid && b >= mid) {
      out.push(i - 1 + (mid - a) / (b - a));
      armed = false;
    }
  }
  return out;
}

export interface Window { from: number; to: number; first: number | null; periods: number }

/** About two periods with a little before the first rise, or the whole record when it has fewer. */
export function twoPeriods(w: Wave, found?: readonly Level[]): Window {
  const r = rises(w, found);
  const n = w.codes.length;
  if (r.length < 3) return { from: 0, to: Math.max(0, n - 1), first: r.length > 1 ? r[0]! : null, periods: Math.max(0, r.length - 1) };
  const t = r[1]! - r[0]!;
  return { from: Math.max(0, Math.floor(r[0]! - 0.22 * t)), to: Math.min(n - 1, Math.ceil(r[2]! + 0.12 * t)), first: r[0]!, periods: r.length - 1 };
}

/** A path through samples from..to, at most two heights a column: the least and the greatest stay. */
export function outline(codes: readonly number[], from: number, to: number, x: (i: number) => number, y: (code: number) => number): string {
  const out: string[] = [];
  const columns = Math.max(1, Math.round(x(to) - x(from)));
  const per = Math.max(1, Math.floor((to - from + 1) / columns));
  for (let i = from; i <= to; i += per) {
    const some = codes.slice(i, Math.min(i + per, to + 1));
    const [lo, hi] = [Math.min(...some), Math.max(...some)];
    const px = Math.round(x(i) * 10) / 10;
    const rising = some[0]! <= some[some.length - 1]!;
    out.push(`${px} ${fix(y(rising ? lo : hi))}`);
    if (hi !== lo) out.push(`${px} ${fix(y(rising ? hi : lo))}`);
  }
  return out.length > 1 ? "M" + out.join("L") : "";
}

function fix(y: number): number {
  return Math.round(y * 10) / 10;
}
