// The geometry of a schematic as a staff: a line a node, an upright a part, packed
// left to right where spans do not meet. Pure.
import type { Schematic, SchematicPart } from "../data/nouns";

export interface Upright {
  part: SchematicPart;
  n: number; // its number in the list, column by column
  column: number;
  top: number; bottom: number; // rows
  gap: number; // the gap its symbol stands in: between this row and the next
  lead: number | null; // the row of a third terminal: gate, base, wiper
}

/** Parts whose third terminal is a lead beside the upright. */
const leads: ReadonlySet<string> = new Set(["npn", "darlington", "nmos"]);

/** The order in which uprights are placed: the load's side at the left, timing in the middle, the timer at the right. */
function rank(p: SchematicPart): number {
  if (p.kind === "timer") return 9;
  return ["load", "flyback", "transistor", "base_resistor", "gate_resistor"].indexOf(p.name) + 1 || 6;
}

export function uprights(s: Schematic): Upright[] {
  const row = new Map(s.nodes.map((n, i) => [n.name, i]));
  const of = (t: { node: string }) => row.get(t.node) ?? 0;
  const all = s.parts.map((part): Upright => {
    const third = part.terminals[2];
    const lead = third && (leads.has(part.kind) || part.kind === "pot") ? of(third) : null;
    const ends = (lead === null ? part.terminals : part.terminals.slice(0, 2)).map(of);
    const [top, bottom] = [Math.min(...ends), Math.max(...ends)];
    // A lead is drawn downwards to its row where it can be, so the symbol stands above it.
    const floor = lead !== null && lead > top ? Math.min(bottom, lead) : bottom;
    return { part, n: 0, column: -1, top, bottom, gap: Math.max(top, Math.floor((top + floor - 1) / 2)), lead };
  });
  const order = [...all].sort((a, b) => rank(a.part) - rank(b.part) || a.top - b.top || a.bottom - b.bottom);
  pack(order);
  order.sort((a, b) => a.column - b.column || a.top - b.top).forEach((u, i) => (u.n = i + 1));
  return order;
}

// A part goes under the one it joins; else to the first column where it meets nobody; else to a column of its own.
function pack(order: readonly Upright[]) {
  const columns: Upright[][] = [];
  for (const u of order) {
    const free = (c: Upright[]) => c.every((v) => v.bottom <= u.top || u.bottom <= v.top);
    const joins = (c: Upright[]) => c.some((v) => v.bottom === u.top);
    const apart = (c: Upright[]) => c.every((v) => v.bottom < u.top || u.bottom < v.top);
    let at = u.part.kind === "timer" ? -1 : columns.findIndex((c) => free(c) && joins(c));
    if (at < 0 && u.part.kind !== "timer") at = columns.findIndex(apart);
    if (at < 0) at = columns.push([]) - 1;
    columns[at]!.push(u);
    u.column = at;
  }
}

/** Of each column how wide it wants to be, as far as `room` goes; what is left over is shared. */
export function columnsAt(wants: readonly number[], left: number, right: number): number[] {
  const total = wants.reduce((a, b) => a + b, 0);
  const spare = right - left - total;
  const out: number[] = [];
  let x = left;
  for (const w of wants) {
    const own = spare >= 0 ? w + spare / wants.length : (w * (right - left)) / total;
    out.push(x);
    x += own;
  }
  return out;
}
