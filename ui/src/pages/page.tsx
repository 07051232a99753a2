// The sheet: head, standing lines, the view, the cautions.
import { useEffect } from "preact/hooks";
import type { BenchModel } from "../data/bench";
import type { Client } from "../data/client";
import { pace } from "../data/words";
import { Alarm } from "../parts/alarm";
import { Cautions } from "../parts/cautions";
import { Standing } from "../parts/standing";
import { BenchView } from "./bench";
import { BoardsView } from "./boards";
import { NowView } from "./now";
import type { Place, Router } from "./router";
import { RunView } from "./run";
import { RunsView } from "./runs";

export interface Views { bench: BenchModel; client: Client; place: Place }

export function Page({ bench, client, router }: { bench: BenchModel; client: Client; router: Router }) {
  const place = router.place.value;
  const stale = bench.link.value.state === "lost";
  useTitle(bench, place);
  const cautions = bench.status.value?.cautions ?? [];
  return (
    <div class={stale ? "sheet stale" : "sheet"}>
      <Head bench={bench} place={place} />
      <Standing bench={bench} />
      {place.route.view !== "now" && <Alarm bench={bench} heading={false} />}
      <View bench={bench} client={client} place={place} />
      <Cautions said={cautions} />
    </div>
  );
}

function View(v: Views) {
  switch (v.place.route.view) {
    case "now": return <NowView {...v} />;
    case "runs": return <RunsView {...v} />;
    case "run": return <RunView key={v.place.route.id} id={v.place.route.id} {...v} />;
    case "boards": return <BoardsView key={v.place.route.hash} hash={v.place.route.hash} {...v} />;
    case "bench": return <BenchView {...v} />;
    default: return <div class="leaf"><main><h1 tabIndex={-1}>There is no page at {v.place.route.path}</h1><p><a href="/">What the bench does now</a> is at the start.</p></main></div>;
  }
}

const views = [["now", "/", "Now"], ["runs", "/runs", "Runs"], ["bench", "/bench", "Bench"], ["boards", "/boards", "Boards"]] as const;

function Head({ bench, place }: { bench: BenchModel; place: Place }) {
  const status = bench.status.value;
  const run = bench.run.value;
  const where = [status?.bench, run && [run.board, run.revision].filter(Boolean).join(" "), run?.board_serial && `serial ${run.board_serial}`].filter(Boolean).join(", ");
  const speed = pace(status);
  const view = place.route.view === "run" ? "runs" : place.route.view;
  return (
    <header class="run-head">
      <span class="name">Nightbench</span>
      <span class="sub">{where}</span>
      {speed && <span class="pace">{speed}</span>}
      <nav aria-label="Views">{views.map(([name, href, words]) => <a key={name} href={href} aria-current={view === name ? "page" : undefined}>{words}</a>)}</nav>
    </header>
  );
}

// The tab's title answers too: what it does this minute, first.
function useTitle(bench: BenchModel, place: Place) {
  const stale = bench.link.value.state === "lost";
  const s = bench.standing.value;
  const names: Record<string, string> = { now: "Now", runs: "Runs", bench: "Bench", boards: "Boards", run: "Run", unknown: "Nightbench" };
  const name = place.route.view === "run" ? `Run ${place.route.id}` : names[place.route.view];
  const doing = stale ? "not live" : s.word.replace(/\.$/, "").toLowerCase();
  useEffect(() => {
    document.title = `${name}: ${doing}. Nightbench`;
  }, [name, doing]);
}
