// A figure's geometry at a width: scales, the strip's place, paths. Pure.
import { prefixFor } from "../data/format";
import { extent, type FigureData, reach, type Series } from "./series";
import { linear, logarithmic, logTicks, type LogTick, niceStep, type Scale, ticks } from "./scale";
import type { Setpoint } from "../data/nouns";

/** The strip shows residuals to this many u; beyond, the number is written. */
export const stripReach = 4;
const pxPerU = 9.6;

/** What a figure runs along. The pot's ohms are on a logarithmic scale. */
export type Along = "pot_resistance" | "pot_position" | "supply_voltage";

export interface Frame {
  along: Along;
  width: number; height: number; narrow: boolean;
  left: number; right: number; top: number; bottom: number; // of the plot, px
  strip: number; axis: number; // middle of the strip and the axis line, px
  dot: number; // radius, px
  factor: number; // SI per unit written on the axis
  yTicks: number[]; xTicks: LogTick[];
  px(ohms: number, dx?: number): number;
  py(y: number): number;
  clampY(y: number): number;
  pu(u: number): number; // in the strip
  dodge(i: number): number; // supplies stand a little apart at the same setting
  linePath(x: readonly number[], y: readonly (number | null)[]): string;
  bandPath(s: Series): string;
}

/** Without a strip where nothing is measured. */
export interface Kind { along?: Along; strip?: boolean }

export function frame(d: FigureData, setpoints: readonly Setpoint[], width: number, { along = "pot_resistance", strip: measured = true }: Kind = {}): Frame {
  const narrow = width < 600;
  const [left, right] = [narrow ? 34 : 40, width - (narrow ? 40 : 64)];
  const top = 30;
  const bottom = top + (narrow ? 300 : 430);
  const strip = bottom + 66;
  const axis = measured ? strip + 46 : bottom + 8;
  let [lo, hi] = extent(d);
  const n = narrow ? 6 : 7;
  const step = niceStep(hi - lo, n);
  hi = d.quantity === "duty" ? hi : Math.ceil(hi / step - 0.02) * step;
  lo = lo < 0 ? Math.floor(lo / step + 0.02) * step : lo;
  const [x0, x1] = reach(d, setpoints);
  const labels = (right - left) / 38;
  const { sx, xTicks } = along === "pot_resistance" ? decades(x0, x1, left, right, labels) : even(x0, x1, left, right, labels / 2);
  const sy = linear(lo, hi, bottom, top);
  const px = (x: number, dx = 0) => round(sx(x) + dx);
  const py = (y: number) => round(sy(y));
  return {
    along, width, height: axis + 40, narrow, left, right, top, bottom, strip, axis,
    dot: narrow ? 2.4 : 3, factor: prefixFor(Math.max(Math.abs(lo), Math.abs(hi)), d.unit)[1],
    yTicks: ticks(lo, hi, n), xTicks,
    px, py,
    clampY: (y) => Math.min(bottom + 6, Math.max(top - 6, py(y))),
    pu: (u) => round(strip - Math.max(-stripReach, Math.min(stripReach, u)) * pxPerU),
    dodge: (i) => (i - (d.series.length - 1) / 2) * (narrow ? 1.2 : 2),
    linePath: (x, y) => pieces(x, y).map((run) => path(run, px, py)).join(""),
    bandPath: (s) => band(s, px, py),
  };
}

function decades(x0: number, x1: number, left: number, right: number, labels: number) {
  const pad = (x1 / x0) ** 0.012;
  return { sx: logarithmic(x0 / pad, x1 * pad, left, right), xTicks: logTicks(x0 / pad, x1 * pad, labels) };
}

function even(x0: number, x1: number, left: number, right: number, labels: number) {
  const pad = (x1 - x0) * 0.012;
  return { sx: linear(x0 - pad, x1 + pad, left, right), xTicks: ticks(x0, x1, labels).map((at) => ({ at, decade: false, labelled: true })) };
}

/** A tenth of a pixel is enough. */
function round(x: number): number {
  return Math.round(x * 10) / 10;
}

type XY = readonly [number, number];

/** The unbroken stretches of a line: where there is no value there is no line. */
export function pieces(x: readonly number[], y: readonly (number | null)[]): XY[][] {
  const out: XY[][] = [[]];
  x.forEach((v, i) => {
    const w = y[i];
    if (w === null || w === undefined) out.push([]);
    else out[out.length - 1]!.push([v, w]);
  });
  return out.filter((r) => r.length > 1);
}

function path(run: readonly XY[], px: Scale, py: Scale): string {
  return "M" + run.map(([x, y]) => `${px(x)} ${py(y)}`).join("L");
}

function band(s: Series, px: Scale, py: Scale): string {
  const highs = pieces(s.x, s.high);
  const lows = pieces(s.x, s.low);
  return highs.map((run, i) => {
    const back = [...(lows[i] ?? [])].reverse();
    return path(run, px, py) + "L" + back.map(([x, y]) => `${px(x)} ${py(y)}`).join("L") + "Z";
  }).join("");
}
