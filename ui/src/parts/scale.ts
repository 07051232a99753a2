// Scales and ticks. Pure.

export type Scale = (x: number) => number;

/** Maps [d0, d1] onto pixels [r0, r1]. */
export function linear(d0: number, d1: number, r0: number, r1: number): Scale {
  const k = d1 === d0 ? 0 : (r1 - r0) / (d1 - d0);
  return (x) => r0 + (x - d0) * k;
}

/** The same on a logarithmic domain; d0 and d1 are above zero. */
export function logarithmic(d0: number, d1: number, r0: number, r1: number): Scale {
  const s = linear(Math.log(d0), Math.log(d1), r0, r1);
  return (x) => s(Math.log(x));
}

/** A step of 1, 2 or 5 times a power of ten that divides the span in about n. */
export function niceStep(span: number, n: number): number {
  const raw = span / n;
  const p = 10 ** Math.floor(Math.log10(raw));
  const m = raw / p;
  return (m <= 1 ? 1 : m <= 2 ? 2 : m <= 5 ? 5 : 10) * p;
}

/** Multiples of a nice step within [lo, hi]. */
export function ticks(lo: number, hi: number, n: number): number[] {
  if (!(hi > lo)) return [lo];
  const step = niceStep(hi - lo, n);
  const out: number[] = [];
  for (let i = Math.ceil(lo / step - 1e-9); i * step <= hi + step * 1e-9; i++) out.push(Number((i * step).toPrecision(12)));
  return out;
}

export interface LogTick { at: number; decade: boolean; labelled: boolean }

/** 1 to 9 of every decade within [lo, hi]; 1, 2 and 5 are labelled while there is room for `labels` of them. */
export function logTicks(lo: number, hi: number, labels: number): LogTick[] {
  const out: LogTick[] = [];
  const decades = Math.log10(hi / lo);
  const written = decades * 3 <= labels ? [1, 2, 5] : decades * 2 <= labels ? [1, 3] : [1];
  for (let d = Math.floor(Math.log10(lo)); d <= Math.ceil(Math.log10(hi)); d++)
    for (let m = 1; m <= 9; m++) {
      const at = Number((m * 10 ** d).toPrecision(12));
      if (at >= lo * 0.999 && at <= hi * 1.001) out.push({ at, decade: m === 1, labelled: written.includes(m) });
    }
  return out;
}

/** The value at x on a polyline with a logarithmic abscissa; null outside it or in a gap. */
export function interpolate(xs: readonly number[], ys: readonly (number | null)[], x: number): number | null {
  for (let i = 1; i < xs.length; i++) {
    const [x0, x1, y0, y1] = [xs[i - 1]!, xs[i]!, ys[i - 1], ys[i]];
    if (x < Math.min(x0, x1) || x > Math.max(x0, x1)) continue;
    if (y0 === null || y0 === undefined || y1 === null || y1 === undefined) return null;
    const t = x1 === x0 ? 0 : Math.log(x / x0) / Math.log(x1 / x0);
    return y0 + t * (y1 - y0);
  }
  return null;
}
