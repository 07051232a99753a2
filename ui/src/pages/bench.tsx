// Bench: each instrument, what it is, and between which nodes it stands.
import { bound, format } from "../data/format";
import type { Bench, Instrument } from "../data/nouns";
import { AlsoHere } from "../parts/instruments";
import { benchNamed, named, shortly } from "../data/words";
import { useAnswer } from "./ask";
import type { Views } from "./page";

export function BenchView({ bench, client }: Views) {
  const link = bench.link.value.state;
  const answer = useAnswer(() => client.bench(), [client, link]);
  const v = bench.vitals.value;
  const b = answer.value;
  return (
    <div class="leaf">
      <main>
        <h1 tabIndex={-1}>{b ? `How ${benchNamed(b.wiring.bench)} is wired` : "The bench"}</h1>
        {answer.failed && <p class="caution">It could not be read: {answer.failed}</p>}
        {!b && !answer.failed && <p class="sub">Waiting for its wiring.</p>}
        {b && <p class="sub">Each instrument stands between two nodes of the board; what it reads is the first less the second.{b.wiring.practice ? " The instruments here are simulated: this is the practice bench." : ""}</p>}
        {b && (
          <table class="wires">
            <thead><tr><th scope="col">no.</th><th scope="col">instrument</th><th scope="col">between</th><th scope="col">who answers</th><th scope="col">now</th></tr></thead>
            <tbody>{b.instruments.map((t, i) => <Row key={t.name} n={i + 1} t={t} between={between(b, t)} now={v?.instruments.find((a) => a.name === t.name)?.words ?? ""} />)}</tbody>
          </table>
        )}
      </main>
      <aside class="margin" aria-label="Limits">
        {b && <Limits b={b} />}
        <h2>By hand</h2>
        <p>If the page says <i>off is not confirmed</i>: switch the bench off at its mains switch.</p>
        <AlsoHere vitals={v} stale={link === "lost"} />
      </aside>
    </div>
  );
}

function Row({ n, t, between, now }: { n: number; t: Instrument; between: string; now: string }) {
  const who = t.identity.maker || t.identity.model ? `${t.identity.maker} ${t.identity.model}, serial ${t.identity.serial}` : t.identity.raw;
  return (
    <tr>
      <td>{n}</td>
      <td>{t.name === t.role ? t.name : `${t.role}, ${shortly(t.name)}`}</td>
      <td>{between}</td>
      <td>{who}<br /><span class="sub">{[t.dialect && `dialect ${t.dialect}`, t.address].filter(Boolean).join(", ")}</span></td>
      <td>{bound(now)}</td>
    </tr>
  );
}

/** Where an instrument stands: "load_hi, load_lo". A scope has a pair a channel. */
export function between(b: Bench, t: Instrument): string {
  const w = b.wiring;
  switch (t.role) {
    case "supply": return w.supply.between.join(", ");
    case "meter": return w.meters.find((m) => m.name === shortly(t.name))?.between.join(", ") ?? "";
    case "scope": return (w.scope?.channels ?? []).map((c) => `${c.number}: ${c.between.join(", ")}, ×${c.probe}`).join("; ");
    case "cutoff": return "in the supply lead";
    case "pot": return "as the board’s variable resistor";
    default: return "";
  }
}

function Limits({ b }: { b: Bench }) {
  const { supply, pot, meters, scope } = b.wiring;
  const lines: [string, string][] = [
    ["never", `above ${format(supply.max_voltage, "V")} or ${format(supply.max_current, "A")}, whatever a plan says`],
    ["supply", `trips by itself at ${format(supply.over_voltage, "V")}`],
  ];
  if (supply.fuse) lines.push(["fuse", `${format(supply.fuse, "A")}, in the supply lead`]);
  if (pot) lines.push(["pot", `at most ${format(pot.max_terminal_voltage, "V")} and ${format(pot.max_current, "A")}; ${format(pot.end_to_end, "Ω")} end to end; parked at code ${pot.park}`]);
  if (scope) lines.push(["scope", scope.earthed ? "its clip is on earth" : "not on earth"]);
  for (const m of meters) lines.push([m.name, `reads ${named(m.reads)}${m.due ? `; calibrated ${m.calibrated}, due ${m.due}` : ""}`]);
  return (
    <>
      <h2>Limits in force</h2>
      <ul class="log">{lines.map(([k, words]) => <li key={k}><span class="k">{k}</span><span>{words}</span></li>)}</ul>
    </>
  );
}
