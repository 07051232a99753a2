import { expect, test } from "vitest";
import { entries, night } from "./fixture";
import { apply, applyAll, countFlagged, logKept, noNight, quantitiesOf } from "./night";
import { type Entry, lean } from "./nouns";

const said = (seq: number, run: number, more: Partial<Entry> = {}): Entry => ({ seq, run, at: "2026-12-01T00:00:00Z", elapsed: 0, kind: "log", words: `line ${seq}`, ...more });

test("a replay gives the run: setpoints, curves, every point once", () => {
  expect(night.run).toBe(41);
  expect(night.setpoints).toHaveLength(72);
  expect(night.curves.map((c) => c.supply_voltage)).toEqual([5, 9, 12]);
  expect(night.points.map((p) => p.setpoint.index)).toEqual([...Array(31).keys()]);
  expect(countFlagged(night.points)).toBe(3);
  expect(night.seq).toBe(entries[entries.length - 1]!.seq);
});

test("live, replayed in parts and replayed twice are the same night", () => {
  expect(entries.reduce(apply, noNight)).toEqual(night);
  expect(applyAll(night, entries)).toBe(night);
  expect(applyAll(applyAll(noNight, entries.slice(0, 17)), entries.slice(9))).toEqual(night);
});

test("a point is kept without raw replies and unmeasured predictions: a page left open all night holds what it draws", () => {
  const p = night.points[0]!;
  const speed = { value: 1, low: 0, high: 2, unit: "rad/s" };
  const kept = lean({ ...p, predictions: { ...p.predictions, speed }, readings: p.readings.map((r) => ({ ...r, raw: ["+4.1E0"] })) });
  expect(JSON.stringify(kept)).not.toContain("+4.1E0");
  expect(Object.keys(kept.predictions)).toEqual(p.readings.map((r) => r.quantity));
});

test("a run that starts while the page is open takes the old one's place", () => {
  const next = apply(night, said(night.seq + 1, 42, { kind: "started", state: "preparing", setpoints: night.setpoints.slice(0, 4) }));
  expect(next).toMatchObject({ run: 42, state: "preparing", points: [], curves: [], off: null });
  expect(next.setpoints).toHaveLength(4);
  expect(next.log).toHaveLength(1);
});

test("a resumed run keeps its points, and a point measured again replaces the old one", () => {
  const over = apply(night, said(night.seq + 1, 41, { kind: "ended", state: "interrupted", words: "The computer was switched off." }));
  expect(over).toMatchObject({ state: "interrupted", reason: "The computer was switched off." });
  const again = apply(over, said(over.seq + 1, 41, { kind: "started", state: "preparing" }));
  expect(again).toMatchObject({ endedAt: "", startedAt: night.startedAt, setpoints: night.setpoints });
  const point = { ...night.points[3]!, elapsed: 9 };
  const measured = apply(again, said(again.seq + 1, 41, { kind: "point", point }));
  expect(measured.points).toHaveLength(31);
  expect(measured.points.filter((p) => p.setpoint.index === 3)).toEqual([point]);
});

test("an entry of no run is a line and changes nothing else", () => {
  const n = apply(night, said(night.seq + 1, 0, { words: "Found energised at start." }));
  expect(n.run).toBe(41);
  expect(n.points).toBe(night.points);
  expect(n.log[n.log.length - 1]!.words).toBe("Found energised at start.");
});

test("off remembers its newest outcome", () => {
  const off = { confirmed: false, by: [], voltage: null, below: 0.5, at: "2026-12-01T00:00:00Z", words: "Turn the switch." };
  expect(apply(night, said(night.seq + 1, 41, { kind: "off", off })).off).toEqual(off);
});

test("the log's memory is bounded", () => {
  const long = applyAll(night, Array.from({ length: 3 * logKept }, (_, i) => said(night.seq + 1 + i, 41)));
  expect(long.log).toHaveLength(logKept);
  expect(long.log[logKept - 1]!.seq).toBe(night.seq + 3 * logKept);
});

test("quantities are those measured, in the order shown; before the first point those predicted", () => {
  const all = ["average_voltage", "duty", "frequency", "output_drop", "motor_current", "supply_current"];
  expect(quantitiesOf(night.points, [])).toEqual(all);
  expect(quantitiesOf([], night.curves)).toEqual(all);
  expect(quantitiesOf(night.points, night.curves, ["speed", "duty"])).toEqual(["duty", "speed"]);
});
