// Each part's load against its rating: a line for the share, a bracket at the rating.
import { byShare, cautionShare, most, partNamed, percent } from "../data/boardwords";
import { format } from "../data/format";
import type { BoardStress } from "../data/nouns";
import { linear } from "./scale";

const [wide, tall] = [168, 16];

export function StressTable({ of, turns }: { of: readonly BoardStress[]; turns: boolean }) {
  if (!of.length) return <p class="sub">It does not oscillate here, so no stress is computed.</p>;
  return (
    <table class="stress stack">
      <caption class="spoken">Stress of each part, the nearest to its rating first</caption>
      <thead><tr>
        <th scope="col">part</th><th scope="col">what</th><th scope="col" class="r">{turns ? "running" : "load"}</th>{turns && <th scope="col" class="r">rotor held</th>}
        <th scope="col" class="r">rating</th><th scope="col">share of the rating</th>
      </tr></thead>
      <tbody>{byShare(of).map((s) => <Row key={s.part + s.what} s={s} turns={turns} />)}</tbody>
    </table>
  );
}

function Row({ s, turns }: { s: BoardStress; turns: boolean }) {
  return (
    <tr>
      <td>{partNamed(s.part)}</td>
      <td>{s.what}</td>
      <td class="r" data-name={turns ? "running" : "load"}>{format(s.running, s.unit, 3)}</td>
      {turns && <td class="r" data-name="rotor held">{format(s.held, s.unit, 3)}</td>}
      <td class="r" data-name="rating">{s.rating === undefined ? "not known" : format(s.rating, s.unit, 3)}</td>
      <td class="share">{s.rating !== undefined && <Share s={s} turns={turns} />}</td>
    </tr>
  );
}

function Share({ s, turns }: { s: BoardStress; turns: boolean }) {
  const top = Math.max(1, most(s));
  const x = linear(0, top, 1, wide - 5);
  const word = most(s) > 1 ? "above its rating" : most(s) > cautionShare ? "close to its rating" : "";
  return (
    <>
      <svg class="fig" viewBox={`0 0 ${wide} ${tall}`} width={wide} height={tall} aria-hidden="true">
        <path class="node" d={`M1 8H${x(1)}`} />
        <rect class="weight" x={1} y={5} width={Math.max(1, x(s.running_share ?? 0) - 1)} height={6} />
        {turns && <path class="tick" d={`M${x(s.held_share ?? 0)} 2V14`} />}
        <path class="ax" d={`M${x(1) - 4} 2h4v12h-4`} />
      </svg>
      <span class="pct">{percent(most(s))}{word && <span class="caution"> {word}</span>}</span>
    </>
  );
}
