// The numbers behind a figure, for a screen reader and for whoever wants them.
import { useState } from "preact/hooks";
import { format, formatU, nbsp, potAt } from "../data/format";
import { type Point, type Quantity, reading } from "../data/nouns";
import { named } from "../data/words";

export function Table({ quantity, points }: { quantity: Quantity; points: readonly Point[] }) {
  const [open, setOpen] = useState(false);
  if (!points.length) return null;
  return (
    <details class="behind" open={open} onToggle={(e) => setOpen((e.currentTarget as HTMLDetailsElement).open)}>
      <summary>The points as a table</summary>
      {open && (
        <table>
          <caption class="spoken">{named(quantity)} by setpoint, in order of measurement</caption>
          <thead><tr><th scope="col">supply</th><th scope="col">pot</th><th scope="col">way</th><th scope="col" class="r">measured</th><th scope="col" class="r">predicted</th><th scope="col" class="r wideonly">95{nbsp}% from</th><th scope="col" class="r wideonly">to</th><th scope="col">flags</th></tr></thead>
          <tbody>{points.map((p) => <Row key={p.setpoint.index} p={p} quantity={quantity} />)}</tbody>
        </table>
      )}
    </details>
  );
}

function Row({ p, quantity }: { p: Point; quantity: Quantity }) {
  const r = reading(p, quantity);
  const pred = p.predictions[quantity];
  const flags = [...(r?.flags ?? []), ...p.flags].map((f) => f.name).join(", ");
  return (
    <tr>
      <td>{format(p.setpoint.supply_voltage, "V", 3)}</td>
      <td>{potAt(p.setpoint)}</td>
      <td>{p.setpoint.recheck ? "recheck" : p.setpoint.direction}</td>
      <td class="r">{r && r.value !== null ? formatU(r.value, r.u, r.unit) : "no value"}</td>
      <td class="r">{pred ? format(pred.value, pred.unit, 4) : ""}</td>
      <td class="r wideonly">{pred ? format(pred.low, pred.unit, 4) : ""}</td>
      <td class="r wideonly">{pred ? format(pred.high, pred.unit, 4) : ""}</td>
      <td class="flagname">{flags}</td>
    </tr>
  );
}
