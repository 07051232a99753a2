// The board as a staff: its nodes are lines in falling potential, its parts pencil uprights.
import { useMemo } from "preact/hooks";
import { partNamed } from "../data/boardwords";
import { count } from "../data/format";
import type { Schematic, SchematicPart } from "../data/nouns";
import { labelWidth } from "./place";
import { columnsAt, type Upright, uprights } from "./staff";
import { Mark } from "./staffmarks";
import { useWidth } from "./width";

export function Staff({ of, file }: { of: Schematic; file: string }) {
  const [box, width] = useWidth<HTMLElement>();
  const drawn = useMemo(() => draw(of, width), [of, width]);
  const timed = of.parts.some((p) => p.kind === "nmos");
  const switched = of.parts.some((p) => ["nmos", "npn", "darlington"].includes(p.kind));
  const also = of.nodes.filter((n) => n.also?.length).map((n) => `${n.also!.join(" and ")} ${n.also!.length > 1 ? "are" : "is"} ${n.name} here, until a current meter parts them`);
  return (
    <figure ref={box}>
      {drawn}
      <figcaption>
        Each node is a line, in falling potential; an upright is a part, with value and tolerance from <span class="q">{file}</span>. A dot joins, a crossing does not.
        {switched && ` The broken lead is the transistor’s ${timed ? "gate" : "base"}.`} {also.join("; ")}{also.length > 0 && "."}
      </figcaption>
      <Parts of={uprights(of)} open={width < 600} />
    </figure>
  );
}

/** Parts named for what they are; the others for what they do. */
const kinds: Record<string, string> = { nmos: "MOSFET", npn: "NPN transistor", darlington: "Darlington", motor: "motor" };

/** What stands beside an upright, in two lines. */
function labels(p: SchematicPart): [string, string] {
  const value = [p.value, p.tolerance].filter(Boolean).join(", ±");
  return [kinds[p.kind] ?? partNamed(p.name === "load" ? "load resistor" : p.name), value];
}

function draw(of: Schematic, width: number) {
  const narrow = width < 600;
  const gap = narrow ? 40 : 48;
  const [top, all] = [16, uprights(of)];
  const named = of.nodes.filter((n) => !n.inner);
  const left = Math.max(...named.map((n) => labelWidth(n.name))) + (narrow ? 4 : 16);
  const y = (row: number) => top + row * gap;
  const n = Math.max(...all.map((u) => u.column)) + 1;
  const wants = Array.from({ length: n }, (_, c) => Math.max(...all.filter((u) => u.column === c).map((u) => (narrow ? 30 : 46 + Math.max(...labels(u.part).map(labelWidth))))));
  const columns = columnsAt(wants, left + (narrow ? 20 : 30), width);
  const x = (u: Upright) => Math.round(columns[u.column]!);
  const height = y(of.nodes.length - 1) + 20;
  const words = `Schematic: ${count(of.parts.length, "part")} between ${count(of.nodes.length, "node")}. The parts are listed below it.`;
  return (
    <svg class="fig staff" width={width} height={height} viewBox={`0 0 ${width} ${height}`} role="img" aria-label={words}>
      {of.nodes.map((node, row) => {
        if (node.inner) return <path key={node.name} class="node" d={stub(all.filter((u) => meets(u, node.name)).map((u) => x(u) - (u.lead === row ? aside : 0)), y(row))} />;
        return (
          <g key={node.name}>
            <path class="node" d={`M${left} ${y(row)}H${width}`} />
            <text class="lab" x={left - (narrow ? 4 : 12)} y={y(row) + 4} text-anchor="end">{node.name}</text>
          </g>
        );
      })}
      {all.map((u) => <One key={u.part.name} u={u} x={x(u)} y={y} gap={gap} rows={of} narrow={narrow} />)}
    </svg>
  );
}

/** How far beside its upright a third terminal's lead runs, px. */
const aside = 13;

/** An inner node is as long as what it joins. */
function stub(xs: readonly number[], y: number): string {
  return `M${Math.min(...xs) - 7} ${y}H${Math.max(...xs) + 7}`;
}

function meets(u: Upright, node: string): boolean {
  return u.part.terminals.some((t) => t.node === node);
}

function One({ u, x, y, gap, rows, narrow }: { u: Upright; x: number; y: (row: number) => number; gap: number; rows: Schematic; narrow: boolean }) {
  const mid = y(u.gap) + gap / 2;
  const row = (node: string) => rows.nodes.findIndex((n) => n.name === node);
  const [name, value] = labels(u.part);
  return (
    <g>
      <path class="wire" d={`M${x} ${y(u.top)}V${y(u.bottom)}`} />
      {u.lead !== null && <path class={u.part.kind === "pot" ? "wire" : "wire broken"} d={`M${x - 5} ${mid}H${x - aside}V${y(u.lead)}`} />}
      <Mark part={u.part} x={x} y={mid} up={row(u.part.terminals[0]!.node) > row(u.part.terminals[1]!.node)} />
      {u.part.terminals.map((t, i) => {
        const at = u.lead !== null && i === 2 ? x - aside : x;
        return (
          <g key={t.node}>
            <circle class="joint" cx={at} cy={y(row(t.node))} r={2.2} />
            {t.pin && !narrow && <text class="pin" x={at - 6} y={y(row(t.node)) - 5} text-anchor="end">{t.pin}</text>}
          </g>
        );
      })}
      {narrow ? <text class="num" x={x + 13} y={mid + 4}>{u.n}</text> : (
        <>
          <text class="part" x={x + 16} y={mid - 2}>{name}</text>
          <text class="lab" x={x + 16} y={mid + 13}>{value}</text>
        </>
      )}
    </g>
  );
}

/** The same in words: by number on a phone, for a screen reader everywhere. */
function Parts({ of, open }: { of: readonly Upright[]; open: boolean }) {
  const table = (
    <table class="wires parts">
      <caption class="spoken">The board’s parts and the nodes each stands between</caption>
      <thead><tr><th scope="col">no.</th><th scope="col">part</th><th scope="col">value</th><th scope="col">between</th></tr></thead>
      <tbody>{of.map(({ part: p, n }) => (
        <tr key={p.name}>
          <td>{n}</td>
          <td>{labels(p)[0]}</td>
          <td>{labels(p)[1]}{p.written && p.written !== p.value && p.written !== "pot" && <span class="sub">, written “{p.written}”</span>}</td>
          <td>{p.terminals.map((t) => (t.pin ? `${t.node} (pin ${t.pin})` : t.node)).join(", ")}</td>
        </tr>
      ))}</tbody>
    </table>
  );
  if (open) return table;
  return <details class="behind"><summary>The parts as a table</summary>{table}</details>;
}
