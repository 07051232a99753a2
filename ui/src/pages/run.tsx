// One run: what was measured, figure and table, and its whole log.
import type { BenchModel } from "../data/bench";
import type { Client } from "../data/client";
import { date, duration } from "../data/format";
import { apply, countFlagged, type Line, type Night, noNight, quantitiesOf } from "../data/night";
import { ended, flagged, type Run } from "../data/nouns";
import { headline, named, sentence, tallied } from "../data/words";
import { Figure } from "../parts/figure";
import { Log } from "../parts/margin";
import { Picker } from "../parts/picker";
import { Tally } from "../parts/tally";
import { useAnswer } from "./ask";
import { paceOf } from "./now";
import type { Views } from "./page";
import { PointsTable } from "./points";

export interface Story { run: Run; night: Night }

export function RunView({ id, bench, client, place }: Views & { id: number }) {
  const { story, failed } = useStory(id, bench, client);
  if (!story)
    return <div class="leaf"><main><h1 tabIndex={-1}>Run {id}</h1><p class={failed ? "caution" : "sub"}>{failed ? `It could not be read: ${failed}` : "Waiting for its points."}</p><p><a href="/runs">All nights</a></p></main></div>;
  const { run, night } = story;
  const quantities = quantitiesOf(night.points, night.curves, run.quantities);
  const chosen = quantities.includes(place.quantity) ? place.quantity : (quantities[0] ?? "");
  return (
    <div class="leaf">
      <main>
        <h1 tabIndex={-1}>{headline(run)}</h1>
        <p class="sub">{facts(run)}</p>
        {run.note && <p class="note">“{run.note}” {run.operator}</p>}
        {ended(run.state) && <Tally setpoints={night.setpoints} points={night.points} now={null} over />}
        {chosen && <Picker quantities={quantities} chosen={chosen} at={`/runs/${id}`} />}
        {chosen && <Figure quantity={chosen} points={night.points} curves={night.curves} setpoints={night.setpoints} now={null} />}
        <h2>Points, in order of measurement</h2>
        <PointsTable points={night.points} quantities={quantities} />
        <Identity run={run} />
      </main>
      <aside class="margin" aria-label="Log"><Log lines={withFlagged(night)} most={2000} /></aside>
    </div>
  );
}

/** The log without the good points (the table has them), flagged ones at their time. */
function withFlagged(n: Night): Line[] {
  const flags = n.points.filter(flagged).map((p): Line => ({ seq: -1 - p.setpoint.index, at: p.at, kind: "point", words: "", point: p }));
  return [...n.log.filter((l) => !l.point), ...flags].sort((a, b) => Date.parse(a.at) - Date.parse(b.at));
}

function facts(r: Run): string {
  const long = r.ended_at ? `, ${duration((Date.parse(r.ended_at) - Date.parse(r.started_at)) / 1000)} long` : "";
  return [
    r.reason && r.state !== "done" ? sentence(r.reason) : "",
    tallied(r), `Started ${date(r.started_at)}${r.operator ? ` by ${r.operator}` : ""}${long}.`, paceOf(r.pace),
  ].filter(Boolean).join(" ");
}

// The run that goes on is the one the page follows anyway; any other is read once, and again when the line is back.
function useStory(id: number, bench: BenchModel, client: Client): { story: Story | null; failed: string } {
  const live = bench.night.value.run === id ? bench.night.value : null;
  const link = bench.link.value.state;
  const answer = useAnswer(() => read(id, client), [client, id, link, live?.state]);
  const got = answer.value;
  if (!got) return { story: null, failed: answer.failed };
  if (!live || live.points.length < got.night.points.length) return { story: got, failed: answer.failed };
  const seen = new Set(got.night.log.map((l) => l.seq));
  const log = [...got.night.log, ...live.log.filter((l) => !l.point && !seen.has(l.seq))];
  const run = { ...got.run, measured: live.points.length, flagged: countFlagged(live.points), state: live.state || got.run.state };
  return { story: { run, night: { ...live, log } }, failed: "" };
}

async function read(id: number, client: Client): Promise<Story> {
  const [whole, points, entries] = await Promise.all([client.run(id), client.points(id), client.log(id)]);
  const night = entries.reduce(apply, { ...noNight, run: id });
  return { run: whole.run, night: { ...night, points, setpoints: whole.setpoints, curves: whole.curves } };
}

function Identity({ run }: { run: Run }) {
  return (
    <>
      <h2>What was measured, with what</h2>
      <table class="plain">
        <tbody>
          <tr><th scope="row">board</th><td>{[run.board, run.revision && `revision ${run.revision}`, run.board_serial && `serial ${run.board_serial}`].filter(Boolean).join(", ")}</td></tr>
          <tr><th scope="row">plan</th><td>{run.plan}</td></tr>
          <tr><th scope="row">bench</th><td>{run.bench}</td></tr>
          {(run.instruments ?? []).map((t) => <tr key={t}><th scope="row">instrument</th><td>{t}</td></tr>)}
          <tr><th scope="row">program</th><td>{run.version}; seed {run.seed}; pace {run.pace}</td></tr>
          {(run.files ?? []).map((f) => <tr key={`${f.role} ${f.name}`}><th scope="row">{named(f.role)} file</th><td>{f.name}<br /><span class="hash">SHA-256 {f.sha256}</span></td></tr>)}
        </tbody>
      </table>
    </>
  );
}
