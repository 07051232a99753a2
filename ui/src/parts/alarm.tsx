// Off is not confirmed: the only box of the whole page.
import type { BenchModel } from "../data/bench";
import { clockSeconds } from "../data/format";

/** `heading` is true where this is the view's headline. */
export function Alarm({ bench, heading }: { bench: BenchModel; heading: boolean }) {
  const v = bench.vitals.value;
  if (v?.energised !== "unconfirmed") return null;
  const off = bench.night.value.off;
  const by = off && !off.confirmed && off.words ? off.words : "Switch the bench off by hand, at its mains switch.";
  const words = `Off is not confirmed. ${by}`;
  return (
    <section class="alarm" role="alert">
      {heading ? <h1 tabIndex={-1}>{words}</h1> : <p class="head">{words}</p>}
      <p class="lead">Until someone does, take the board as live.{v.detail ? ` ${v.detail}` : ""}{v.read_at ? ` The supply was last read at ${clockSeconds(v.read_at)}.` : ""}</p>
      <p>After the switch: wait until the motor stands, then press “Outputs off” once more, so that the log has it.</p>
    </section>
  );
}
