// Predicted curves alone: pencil lines in their bands, a supply each, and an upright at the setting looked at.
import { useMemo, useState } from "preact/hooks";
import { potAt, rangeOf, settingAt } from "../data/boardwords";
import { format, nbsp } from "../data/format";
import type { BoardDetail, Curve, Quantity } from "../data/nouns";
import { listed, named, sentenceCase, titled } from "../data/words";
import { prefixFor } from "../data/format";
import { Axes } from "./axes";
import { type Frame, frame } from "./frame";
import { labelWidth, spread } from "./place";
import { figureData, type Series } from "./series";
import { useWidth } from "./width";

export function BoardFigure({ d, quantity }: { d: BoardDetail; quantity: Quantity }) {
  const [box, width] = useWidth<HTMLElement>();
  const drawn = useMemo(() => draw(d, quantity, width), [d, quantity, width]);
  return (
    <figure ref={box}>
      {drawn}
      <CurveTable d={d} quantity={quantity} />
    </figure>
  );
}

/** Curves as the figures have them. One along the supply has none of its own. */
function curvesOf(d: BoardDetail): Curve[] {
  return d.curves.map((c) => ({ supply_voltage: c.supply_voltage ?? 0, pot_resistance: c.at, quantities: c.quantities }));
}

function draw(d: BoardDetail, quantity: Quantity, width: number) {
  const data = figureData(quantity, [], curvesOf(d), []);
  if (!data.series.length) return <figcaption>{sentenceCase(titled(quantity))}: no prediction, for the board does not oscillate.</figcaption>;
  const f = frame(data, [], width, { along: d.along, strip: false });
  const unit = data.unit === "1" || !data.unit ? "" : `, ${prefixFor(f.factor, data.unit)[0]}${data.unit}`;
  const along = d.along !== "supply_voltage";
  const ends = spread(data.series.map((s) => f.py(last(s)) + 4), 15);
  return (
    <>
      <svg class="fig" width={f.width} height={f.height} viewBox={`0 0 ${f.width} ${f.height}`} role="img" aria-label={describes(d, quantity)}>
        <Axes f={f} title={titled(quantity) + unit} />
        {data.series.map((s) => <path key={s.supply} class="band" d={f.bandPath(s)} />)}
        {data.series.map((s) => <path key={s.supply} class="pencil" d={f.linePath(s.x, s.value)} />)}
        {along && data.series.map((s, i) => <text key={s.supply} class="lab strong" x={f.right + 7} y={ends[i]} text-anchor="start">{format(s.supply, "V", 3)}</text>)}
        <Here d={d} f={f} quantity={quantity} />
      </svg>
      <figcaption>{caption(d, quantity)}</figcaption>
    </>
  );
}

function last(s: Series): number {
  for (let i = s.value.length - 1; i >= 0; i--) if (s.value[i] !== null && s.value[i] !== undefined) return s.value[i]!;
  return 0;
}

/** Where the setting is, with its value and band. */
function Here({ d, f, quantity }: { d: BoardDetail; f: Frame; quantity: Quantity }) {
  const at = d.along === "supply_voltage" ? d.setting.supply_voltage : d.setting.pot;
  const p = d.values[quantity];
  if (at === undefined) return null;
  const x = f.px(at);
  if (x < f.left || x > f.right) return null;
  const words = settingAt(d, d.setting);
  const value = p ? format(p.value, p.unit, 4) : "no value";
  const wide = Math.max(labelWidth(words), labelWidth(value)) * 1.05;
  const [tx, anchor] = x + wide + 10 > f.right ? [x - 7, "end" as const] : [x + 7, "start" as const];
  const y = p && f.py(p.value) < f.top + 60 ? f.bottom - 26 : f.top + 14;
  return (
    <g>
      <path class="level" d={`M${x} ${f.top}V${f.axis}`} />
      {p && <path class="here" d={`M${x - 5} ${f.py(p.high)}h10M${x - 5} ${f.py(p.low)}h10M${x} ${f.py(p.low)}V${f.py(p.high)}`} />}
      <text class="lab strong halo" x={tx} y={y} text-anchor={anchor}>{words}</text>
      <text class="lab halo" x={tx} y={y + 16} text-anchor={anchor}>{value}</text>
    </g>
  );
}

function describes(d: BoardDetail, quantity: Quantity): string {
  const p = d.values[quantity];
  const over = d.along === "supply_voltage" ? "the supply voltage" : d.along === "pot_position" ? "the pot’s position" : "pot resistance";
  const supplies = d.curves.flatMap((c) => (c.supply_voltage === undefined ? [] : [format(c.supply_voltage, "V", 3)]));
  const there = p ? ` At ${settingAt(d, d.setting)} it is ${format(p.value, p.unit, 4)}, from ${format(p.low, p.unit, 4)} to ${format(p.high, p.unit, 4)}.` : "";
  return `${sentenceCase(titled(quantity))} against ${over}${supplies.length ? ` at ${listed(supplies)}` : ""}, predicted, ${rangeOf(d)}.${there}`;
}

function caption(d: BoardDetail, quantity: Quantity): string {
  const p = d.values[quantity];
  const there = p ? ` At ${settingAt(d, d.setting)} the ${named(quantity)} is ${format(p.value, p.unit, 4)}, 95${nbsp}% from ${format(p.low, p.unit, 4)} to ${format(p.high, p.unit, 4)}.` : "";
  return `Pencil is predicted from the schematic; its band holds 95${nbsp}% of ${d.draws} boards drawn within tolerance, at ${format(d.setting.temperature, "°C", 3)}.${there}`;
}

/** Every how many of a curve's settings stands in the table. */
const every = 4;

function CurveTable({ d, quantity }: { d: BoardDetail; quantity: Quantity }) {
  const [open, setOpen] = useState(false);
  const along = d.along !== "supply_voltage";
  const at = d.curves[0]?.at ?? [];
  if (!at.length) return null;
  const rows = at.map((x, i) => ({ x, i })).filter(({ i }) => i % every === 0);
  return (
    <details class="behind" open={open} onToggle={(e) => setOpen((e.currentTarget as HTMLDetailsElement).open)}>
      <summary>The curves as a table</summary>
      {open && (
        <table>
          <caption class="spoken">{named(quantity)}, value and 95{nbsp}% interval</caption>
          <thead><tr><th scope="col">{along ? "pot" : "supply"}</th>{d.curves.map((c, k) => <th key={k} scope="col" class="r">{c.supply_voltage === undefined ? named(quantity) : format(c.supply_voltage, "V", 3)}</th>)}</tr></thead>
          <tbody>{rows.map(({ x, i }) => (
            <tr key={i}>
              <th scope="row">{along ? potAt(d, x) : format(x, "V", 3)}</th>
              {d.curves.map((c, k) => <td key={k} class="r">{cell(c.quantities[quantity], i)}</td>)}
            </tr>
          ))}</tbody>
        </table>
      )}
    </details>
  );
}

function cell(line: Curve["quantities"][string] | undefined, i: number): string {
  const [v, low, high] = [line?.value[i], line?.low[i], line?.high[i]];
  if (!line || typeof v !== "number") return "does not oscillate";
  return `${format(v, line.unit, 4)}, ${format(low ?? v, line.unit, 4)} to ${format(high ?? v, line.unit, 4)}`;
}
