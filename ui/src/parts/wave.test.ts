import { expect, test } from "vitest";
import type { Wave } from "../data/nouns";
import { levels, outline, rises, twoPeriods, volts } from "./wave";

const wave = (codes: number[]): Wave => ({ node: "timer_out less common", channel: 1, start: 0, interval: 1e-5, volts_per_code: 0.05, volts_at_zero: 4, codes });
// 100 samples a period, 30 of them high; from −80 (0 V) to 90 (8.5 V)
const square = wave(Array.from({ length: 520 }, (_, i) => ((i + 60) % 100 < 30 ? 90 : -80)));
// driven 30, freewheel 20, resting the other 50 at 20 (5 V)
const motor = wave(Array.from({ length: 520 }, (_, i) => [90, -87, 20][(i + 60) % 100 < 30 ? 0 : (i + 60) % 100 < 50 ? 1 : 2]!));

test("two levels, or three where a motor rests", () => {
  expect(levels(square).map((l) => [l.name, Number(l.volts.toFixed(6))])).toEqual([["high", 8.5], ["low", 0]]);
  expect(levels(motor).map((l) => [l.name, Number(l.volts.toFixed(6))])).toEqual([["driven", 8.5], ["rest", 5], ["freewheel", -0.35]]);
  expect(levels(wave([5, 5, 5]))).toEqual([{ name: "constant", volts: volts(square, 5) }]);
  expect(levels(wave([]))).toEqual([]);
});

test("rises are those to the highest level, not the motor coming to rest", () => {
  expect(rises(square).map((r) => Math.round(r))).toEqual([40, 140, 240, 340, 440]);
  expect(rises(motor).map((r) => Math.round(r))).toEqual([40, 140, 240, 340, 440]);
  expect(rises(wave([5, 5, 5]))).toEqual([]);
});

test("about two periods are shown, the whole record where there are fewer", () => {
  expect(twoPeriods(square)).toMatchObject({ from: 17, to: 252, periods: 4 });
  expect(twoPeriods(wave(square.codes.slice(0, 160)))).toMatchObject({ from: 0, to: 159, periods: 1 });
  expect(twoPeriods(wave([]))).toEqual({ from: 0, to: 0, first: null, periods: 0 });
});

test("no peak is lost when many samples share a column", () => {
  const codes = new Array<number>(10_000).fill(0);
  codes[5_001] = 77;
  const d = outline(codes, 0, codes.length - 1, (i) => i / 50, (c) => -c);
  expect(d).toContain(" -77");
  expect(d.split("L").length).toBeLessThan(500);
});
