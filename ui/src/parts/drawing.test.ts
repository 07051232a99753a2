// The pure half of the figures: scales, series, geometry, places for words.
import { expect, test } from "vitest";
import { night } from "../data/fixture";
import type { Point } from "../data/nouns";
import { annotate } from "./annotate";
import { caption, description } from "./figurewords";
import { frame, pieces, stripReach } from "./frame";
import { Room, spread } from "./place";
import { interpolate, linear, logarithmic, logTicks, niceStep, ticks } from "./scale";
import { extent, figureData, reach } from "./series";
import { marks } from "./tally";

const data = figureData("average_voltage", night.points, night.curves, night.setpoints);

test("scales and ticks", () => {
  expect(linear(0, 10, 100, 0)(2.5)).toBe(75);
  expect(logarithmic(1e3, 1e5, 0, 100)(1e4)).toBeCloseTo(50, 9);
  expect([niceStep(12, 7), niceStep(0.5, 7), niceStep(1300, 6)]).toEqual([2, 0.1, 500]);
  expect(ticks(0, 0.6, 6)).toEqual([0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6]);
  expect(ticks(-3, 3, 6)).toEqual([-3, -2, -1, 0, 1, 2, 3]);
});

test("log ticks: every decade line, labels while there is room", () => {
  const t = logTicks(1e3, 1e5, 20);
  expect(t).toHaveLength(19);
  expect(t.filter((x) => x.decade).map((x) => x.at)).toEqual([1e3, 1e4, 1e5]);
  expect(t.filter((x) => x.labelled).map((x) => x.at)).toEqual([1e3, 2e3, 5e3, 1e4, 2e4, 5e4, 1e5]);
  expect(logTicks(1e3, 1e5, 3).filter((x) => x.labelled)).toHaveLength(3);
});

test("a curve is read between its points, and not in a gap", () => {
  expect(interpolate([1, 100], [0, 2], 10)).toBeCloseTo(1, 12);
  expect(interpolate([1, 10, 100], [0, null, 2], 20)).toBeNull();
  expect(interpolate([1, 10], [0, 1], 11)).toBeNull();
  expect(pieces([1, 2, 3, 4, 5], [1, 2, null, 4, 5])).toEqual([[[1, 1], [2, 2]], [[4, 4], [5, 5]]]);
});

test("a series a supply, residuals in joint uncertainties", () => {
  expect(data.series.map((s) => [s.supply, s.dots.length, s.passes.length])).toEqual([[5, 24, 2], [9, 7, 1], [12, 0, 0]]);
  const p = night.points[0]!;
  const [r, q] = [p.readings.find((x) => x.quantity === "average_voltage")!, p.predictions.average_voltage!];
  const joint = Math.sqrt(r.u! ** 2 + ((q.high - q.low) / 3.92) ** 2);
  expect(data.series[0]!.dots[0]!.residual).toBeCloseTo((r.value! - q.value) / joint, 12);
  expect(data.series[0]!.dots.filter((d) => d.hollow).map((d) => d.index)).toEqual([10, 13]);
});

test("a lost point is a gap in the curve, never bridged", () => {
  const without = night.points.filter((p) => p.setpoint.index !== 5);
  const up = figureData("duty", without, night.curves, night.setpoints).series[0]!.passes[0]!;
  expect(up.runs.map((r) => r.map((d) => d.index))).toEqual([[0, 1, 2, 3, 4], [6, 7, 8, 9, 10, 11]]);
});

test("a reading without a value draws nothing, and breaks the line", () => {
  const none: Point[] = night.points.map((p) => (p.setpoint.index === 2 ? { ...p, readings: p.readings.map((r) => ({ ...r, value: null, u: null, flags: [{ name: "overload", words: "" }] })) } : p));
  const s = figureData("duty", none, [], night.setpoints).series[0]!;
  expect(s.dots.map((d) => d.index)).not.toContain(2);
  expect(s.passes[0]!.runs).toHaveLength(2);
});

test("rechecks are dots of their own, in no pass", () => {
  const rechecks = night.setpoints.map((s) => ({ ...s, recheck: s.index === 4 }));
  const points = night.points.map((p) => ({ ...p, setpoint: rechecks[p.setpoint.index]! }));
  const s = figureData("duty", points, night.curves, rechecks).series[0]!;
  expect(s.dots.find((d) => d.index === 4)!.recheck).toBe(true);
  expect(s.passes[0]!.runs.flat().map((d) => d.index)).toEqual([0, 1, 2, 3, 5, 6, 7, 8, 9, 10, 11]);
});

test("volts start at zero, duty ends at one, the axis spans the plan", () => {
  expect(extent(data)[0]).toBe(0);
  expect(extent(figureData("duty", night.points, [], []))).toEqual([0, 1]);
  expect(extent({ quantity: "duty", unit: "1", series: [] })).toEqual([0, 1]);
  expect(reach(data, night.setpoints)).toEqual([1000, 100_000]);
  expect(reach({ ...data, series: [] }, [])).toEqual([1e3, 1e5]);
});

test.each([390 - 32, 960, 1400])("at %d px everything lies on the sheet", (width) => {
  const f = frame(data, night.setpoints, width);
  const notes = annotate(f, data, { setpoint: night.setpoints[31]!, repeat: 3, repeats: 5, word: "now" });
  for (const s of data.series) for (const d of s.dots) {
    expect(f.px(d.x)).toBeGreaterThanOrEqual(f.left);
    expect(f.px(d.x)).toBeLessThanOrEqual(f.right);
    expect(f.py(d.y)).toBeGreaterThanOrEqual(f.top);
    expect(f.py(d.y)).toBeLessThanOrEqual(f.bottom);
  }
  for (const l of notes.labels) {
    expect(l.x).toBeGreaterThanOrEqual(0);
    expect(l.x).toBeLessThanOrEqual(width);
    expect(l.y).toBeLessThanOrEqual(f.height);
  }
  expect(notes.labels.map((l) => l.text)).toContain(width < 600 ? "3 of 5" : "3 of 5 repeats");
  expect(notes.labels.filter((l) => ["5\u00a0V", "9\u00a0V", "12\u00a0V"].includes(l.text))).toHaveLength(3);
});

test("a residual beyond the strip stays on its edge", () => {
  const f = frame(data, night.setpoints, 960);
  expect(f.pu(99)).toBe(f.pu(stripReach));
  expect(f.pu(-99)).toBe(f.pu(-stripReach));
});

test("words go where they cover least, and labels keep apart", () => {
  const room = new Room({ x: 0, y: 0, w: 100, h: 100 });
  for (let x = 0; x < 50; x += 3) room.mark(x, 20);
  const [busy, free] = [{ x: 5, y: 10, w: 40, h: 15 }, { x: 5, y: 60, w: 40, h: 15 }];
  expect(room.place([busy], 3)).toBeNull();
  expect(room.place([busy, free])).toBe(free);
  expect(room.place([busy, free])).toBe(busy);
  expect(room.place([{ x: 90, y: 0, w: 40, h: 15 }], 100)).toBeNull();
  const apart = spread([10, 11, 40], 15);
  expect(apart[1]! - apart[0]!).toBeGreaterThanOrEqual(14.9);
  expect(apart[2]).toBe(40);
});

test("the figure says what it shows, and where the board departs most", () => {
  expect(description(data, night.points).replaceAll("\u00a0", " ")).toBe("Average voltage across the load against pot resistance at 5 V, 9 V and 12 V, measured and predicted. 31 points measured, 3 flagged. Nothing measured yet at 12 V.");
  const off = { ...data, series: data.series.map((s) => ({ ...s, dots: s.dots.map((d) => (d.index === 11 ? { ...d, residual: -6.4 } : { ...d, residual: 0.1 })) })) };
  expect(caption(off).replaceAll("\u00a0", " ")).toMatch(/A hollow dot carries a flag\. One point is more than 2 u from the prediction, at 5 V, [\d.]+ k: −6\.4 u\.$/);
});

test("the tally: measured, flagged, lost and to come", () => {
  const m = marks(night.setpoints, night.points.filter((p) => p.setpoint.index !== 7));
  expect([m[0], m[7], m[10], m[31], m[71]]).toEqual(["measured", "lost", "flagged", "coming", "coming"]);
  expect(m).toHaveLength(72);
});
