// What one percent of each part makes of a quantity: bars from a line of no effect, the greatest first.
import { type Bar, bars, least, partNamed } from "../data/boardwords";
import { nbsp, tidy } from "../data/format";
import type { BoardDetail, Quantity } from "../data/nouns";
import { named } from "../data/words";
import { linear } from "./scale";

/** Bars shown before the rest is only counted. */
const shown = 14;
const [wide, tall] = [300, 16];

export function Sensitivities({ d, quantity }: { d: BoardDetail; quantity: Quantity }) {
  const all = bars(d, quantity);
  const some = all.bars.slice(0, shown);
  const rest = all.bars.length - some.length + all.rest;
  if (!some.length) return <p class="sub">{d.sensitivities.length ? `No part moves the ${named(quantity)} here.` : "It does not oscillate here, so there is nothing to move."}</p>;
  const most = Math.abs(some[0]!.value);
  return (
    <>
      <table class="bars">
        <caption class="spoken">Change of {named(quantity)} in percent for one percent more of each part</caption>
        <thead><tr><th scope="col">one percent more of</th><th aria-hidden="true"><span class="wideonly">less, more</span></th><th scope="col" class="r">{named(quantity)}</th></tr></thead>
        <tbody>{some.map((b) => (
          <tr key={b.part}>
            <th scope="row">{partNamed(b.part)}</th>
            <td class="bar"><One b={b} most={most} /></td>
            <td class="r">{signed(b.value)}</td>
          </tr>
        ))}</tbody>
      </table>
      {rest > 0 && <p class="sub small">{rest} more make {all.bars.length > shown ? "less" : `less than ${least}${nbsp}%`} each.</p>}
    </>
  );
}

function One({ b, most }: { b: Bar; most: number }) {
  const x = linear(-most, most, 4, wide - 4);
  const [from, to] = [Math.min(x(0), x(b.value)), Math.max(x(0), x(b.value))];
  return (
    <svg class="fig" viewBox={`0 0 ${wide} ${tall}`} width={wide} height={tall} preserveAspectRatio="none" aria-hidden="true">
      <rect class="weight" x={from} y={4} width={Math.max(1, to - from)} height={8} />
      <path class="ax" d={`M${x(0)} 0V${tall}`} />
    </svg>
  );
}

/** "+0.741 %", "−1.57 %" */
export function signed(x: number): string {
  const s = Math.abs(x) >= 0.1 ? x.toPrecision(3) : x.toFixed(3);
  return tidy(x > 0 ? "+" + s : s) + `${nbsp}%`;
}
