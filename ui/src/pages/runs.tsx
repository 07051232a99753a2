// Runs: the dated log of nights, newest first under months.
import { clock, day, month, nbsp } from "../data/format";
import { ended, type Run } from "../data/nouns";
import { count } from "../data/format";
import { benchNamed, named } from "../data/words";
import { MiniTally } from "../parts/tally";
import { useAnswer } from "./ask";
import type { Views } from "./page";

export function RunsView({ bench, client }: Views) {
  const night = bench.night.value;
  const link = bench.link.value.state;
  const answer = useAnswer(() => client.runs(), [client, link, night.run, night.state]);
  const runs = (answer.value ?? []).map((r) => (r.id === night.run ? { ...r, measured: Math.max(r.measured, night.points.length) } : r));
  const months = [...new Set(runs.map((r) => month(r.started_at)))];
  const name = bench.status.value?.bench;
  return (
    <div class="leaf">
      <main>
        <h1 tabIndex={-1}>{name ? `Nights on ${benchNamed(name)}` : "Nights"}</h1>
        {answer.failed && <p class="caution">The list could not be read: {answer.failed}</p>}
        {!answer.value && !answer.failed && <p class="sub">Waiting for the list.</p>}
        {answer.value?.length === 0 && <p class="sub">None yet. A run is started with <span class="q">nightbench start PLAN</span>.</p>}
        {months.map((m) => (
          <section key={m}>
            <h2 class="month">{m}</h2>
            <ol class="nights">{runs.filter((r) => month(r.started_at) === m).map((r) => <NightItem key={r.id} r={r} />)}</ol>
          </section>
        ))}
      </main>
      <aside class="margin" aria-label="Reading the log">
        <h2>Reading the strokes</h2>
        <p>Each setpoint of a plan is a stroke, in the order it was measured. A tall stroke is measured, a short pencil stroke was not reached. Which points are flagged is on the run’s own page.</p>
      </aside>
    </div>
  );
}

function NightItem({ r }: { r: Run }) {
  return (
    <li>
      <div class="date">{day(r.started_at)}<small>{clock(r.started_at)}{r.ended_at ? ` to ${clock(r.ended_at)}` : ", going on"}</small></div>
      <div>
        <p><Sentence r={r} /></p>
        <MiniTally planned={r.planned} measured={r.measured} />
        {r.note && <p class="note">“{r.note}”</p>}
        {r.pace !== 1 && <p class="note">Practice bench at {r.pace}{nbsp}×{nbsp}speed.</p>}
      </div>
      <div class="pick"><a href={`/runs/${r.id}`}>Run {r.id}</a></div>
    </li>
  );
}

function Sentence({ r }: { r: Run }) {
  const serial = r.board_serial ? `Serial ${r.board_serial}` : r.board || r.plan;
  const good = r.measured - r.flagged;
  const tally = r.measured === r.planned && r.planned ? `${good} good${r.flagged ? `, ${r.flagged} flagged` : ""}.` : `${count(r.measured, "point")} of ${r.planned} kept${r.flagged ? `, ${r.flagged} flagged` : ""}.`;
  const why = r.reason && r.state !== "done" ? `: ${r.reason.replace(/\.$/, "")}` : r.operator && r.state === "stopped" ? ` by ${r.operator}` : "";
  return <>{serial}, <b>{ended(r.state) ? named(r.state) : named(r.state)}</b>{why}. {tally}</>;
}
