// The points of a run as a table; on a phone each is an entry of a few lines.
import { format, formatU, potAt } from "../data/format";
import { flagged, type Point, type Quantity, reading } from "../data/nouns";
import { named } from "../data/words";
import { Flags } from "../parts/flags";

export function PointsTable({ points, quantities }: { points: readonly Point[]; quantities: readonly Quantity[] }) {
  if (!points.length) return <p class="sub">None yet.</p>;
  return (
    <table class="points stack">
      <thead><tr><th scope="col" class="r">no.</th><th scope="col">supply</th><th scope="col">pot</th><th scope="col">way</th>{quantities.map((q) => <th scope="col" class="r" key={q}>{named(q)}</th>)}</tr></thead>
      <tbody>{points.map((p) => <Row key={p.setpoint.index} p={p} quantities={quantities} />)}</tbody>
    </table>
  );
}

function Row({ p, quantities }: { p: Point; quantities: readonly Quantity[] }) {
  const s = p.setpoint;
  return (
    <>
      <tr>
        <td class="r num">{s.index + 1}</td>
        <td>{format(s.supply_voltage, "V", 3)}</td>
        <td>{potAt(s)}</td>
        <td>{s.recheck ? "recheck" : s.direction}</td>
        {quantities.map((q) => <td class="r" key={q} data-name={named(q)}>{value(p, q)}</td>)}
      </tr>
      {flagged(p) && <tr class="why"><td /><td colSpan={3 + quantities.length}><Flags of={p} />.</td></tr>}
    </>
  );
}

function value(p: Point, q: Quantity) {
  const r = reading(p, q);
  if (!r) return "";
  return <>{r.value === null ? "no value" : formatU(r.value, r.u, r.unit)}{r.flags.length > 0 && <sup title="flagged">○</sup>}</>;
}
