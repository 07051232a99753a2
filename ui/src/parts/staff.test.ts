// The packing of a schematic: every part stands once, none on another, joins under joins.
import { expect, test } from "vitest";
import { board } from "../data/fixture";
import type { Schematic, SchematicPart } from "../data/nouns";
import { columnsAt, type Upright, uprights } from "./staff";

const of = (all: readonly Upright[], name: string) => all.find((u) => u.part.name === name)!;

/** No two uprights of a column share a stretch of it. */
function clear(all: readonly Upright[]) {
  for (const a of all) for (const b of all) if (a !== b && a.column === b.column) expect(a.bottom <= b.top || b.bottom <= a.top, `${a.part.name} stands on ${b.part.name}`).toBe(true);
}

test("the example: its branch is one column, its transistor under the motor, the timer last", () => {
  const all = uprights(board.schematic);
  clear(all);
  const branch = ["charge", "pot", "stop", "discharge_diode", "capacitor"].map((n) => of(all, n).column);
  expect(new Set(branch).size).toBe(1);
  expect(of(all, "transistor").column).toBe(of(all, "load").column);
  expect(of(all, "timer").column).toBe(Math.max(...all.map((u) => u.column)));
  expect(all.map((u) => u.n)).toEqual(all.map((_, i) => i + 1));
  const gate = of(all, "transistor");
  expect(gate.lead).toBe(board.schematic.nodes.findIndex((n) => n.name === "gate"));
  expect(gate.gap).toBeLessThan(gate.lead!);
});

const part = (name: string, ...nodes: string[]): SchematicPart => ({ name, kind: "resistor", value: "1 Ω", terminals: nodes.map((node) => ({ node })) });

test("parts that meet get columns of their own; those apart share one", () => {
  const s: Schematic = { nodes: ["supply", "discharge", "capacitor", "timer_out", "common"].map((name) => ({ name })), parts: [part("a", "supply", "discharge"), part("b", "supply", "discharge"), part("c", "timer_out", "common"), part("d", "supply", "common")] };
  const all = uprights(s);
  clear(all);
  expect(["a", "b", "c", "d"].map((n) => of(all, n).column)).toEqual([0, 1, 0, 2]);
});

test("columns share what is left, and shrink alike where there is too little", () => {
  expect(columnsAt([50, 100], 0, 200)).toEqual([0, 75]);
  expect(columnsAt([50, 150], 0, 100)).toEqual([0, 25]);
});
