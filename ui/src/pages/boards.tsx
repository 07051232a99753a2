// Boards: what a board's schematic gives. Words first, then the staff, the curves, what moves them, what is stressed.
import { asked, boardHeadline, boardNamed, motorWords, oscillation, settingAt, stressedMost, whatItIs } from "../data/boardwords";
import { bound, count, date, format, nbsp, ohms } from "../data/format";
import { quantitiesOf } from "../data/night";
import type { Board, BoardDetail, Quantity } from "../data/nouns";
import { listed, named, sentence } from "../data/words";
import { Sensitivities } from "../parts/bars";
import { BoardFigure } from "../parts/boardfigure";
import { Picker } from "../parts/picker";
import { Staff } from "../parts/stafffigure";
import { StressTable } from "../parts/stresstable";
import { useAnswer } from "./ask";
import type { Views } from "./page";
import type { At } from "./router";

export function BoardsView({ hash, bench, client, place }: Views & { hash: string }) {
  const link = bench.link.value.state;
  const list = useAnswer(() => client.boards(), [client, link, bench.night.value.run]);
  const boards = list.value ?? [];
  const chosen = hash || boards[0]?.hash || "";
  const { asked: at, wrong } = asked(place.at);
  const answer = useAnswer(async () => (chosen && !wrong ? client.board(chosen, at) : null), [client, link, chosen, at.supply, at.pot, at.temperature, wrong]);
  const d = answer.value;
  const failed = wrong || answer.failed || list.failed;
  return (
    <div class="leaf">
      <main>
        <h1 tabIndex={-1}>{d ? boardHeadline(d) : list.value?.length === 0 ? "No board has been measured here yet" : "The board"}</h1>
        {failed && <p class="caution">{wrong ? failed : `It could not be computed: ${sentence(failed)}`}</p>}
        {!d && !failed && <Waiting none={list.value?.length === 0} />}
        {d && <Drawn d={d} place={place} at={`/boards/${chosen}`} />}
      </main>
      <aside class="margin" aria-label="Boards and runs">
        {d && <Told d={d} />}
        <Others boards={boards} chosen={chosen} />
      </aside>
    </div>
  );
}

function Waiting({ none }: { none: boolean }) {
  if (none) return <p class="sub">A board stands here when a run has been started with it: <span class="q">nightbench start PLAN</span>. Before that, <span class="q">nightbench predict BOARD</span> computes the same.</p>;
  return <p class="sub">A thousand boards within tolerance are being computed; it takes some seconds.</p>;
}

/** Quantities that say nothing when predicted: what is set is no answer. */
const given: ReadonlySet<Quantity> = new Set(["supply_voltage", "ambient", "pot_resistance"]);

function Drawn({ d, place, at }: { d: BoardDetail; place: Views["place"]; at: string }) {
  const all = quantitiesOf([], d.curves.map((c) => ({ supply_voltage: c.supply_voltage ?? 0, pot_resistance: c.at, quantities: c.quantities }))).filter((q) => !given.has(q));
  const chosen = all.includes(place.quantity) ? place.quantity : (all[0] ?? "duty");
  const here = settingAt(d, d.setting, true);
  const turns = d.schematic.parts.some((p) => p.kind === "motor");
  return (
    <>
      <p class="lead">{oscillation(d)} {stressedMost(d)}</p>
      <p class="sub">{whatItIs(d)}</p>
      <Staff of={d.schematic} file={d.board.file} />
      <h2>Predicted {d.along === "supply_voltage" ? "over the supply" : "over the pot"}</h2>
      <Picker quantities={all} chosen={chosen} at={at + kept(place.at)} />
      <BoardFigure d={d} quantity={chosen} />
      <h2>At {here}</h2>
      <Setting d={d} typed={place.at} at={at} quantity={place.quantity} />
      {d.flags.map((f) => <p key={f.name + f.words} class="sub"><i>{named(f.name)}</i>: {bound(f.words)}.</p>)}
      {motorWords(d) && <p>{motorWords(d)}</p>}
      <Values d={d} quantities={all} />
      <h2>What moves the {named(chosen)} at {here}</h2>
      <Sensitivities d={d} quantity={chosen} />
      <h2>Stress at {here}</h2>
      <StressTable of={d.stress} turns={turns} />
      <p class="sub small">{turns ? "The bar is the share while running, the stroke with the rotor held, the bracket the rating." : "The bar is the share, the bracket the rating."} A plan is cautioned above 70{nbsp}% of a rating, and refused above it. The bench’s own pot is rated by its bench file.</p>
    </>
  );
}

/** The setting typed, to be kept when the quantity changes. */
function kept(at: At): string {
  const q = new URLSearchParams(Object.entries(at).filter(([, v]) => v));
  return q.size ? `?${q}` : "";
}

function Setting({ d, typed, at, quantity }: { d: BoardDetail; typed: At; at: string; quantity: Quantity }) {
  const s = d.setting;
  const pot = s.pot === undefined ? "" : d.along === "pot_position" ? String(s.pot) : ohms(s.pot).replace(`${nbsp}Ω`, "").replace(nbsp, "");
  return (
    <form key={`${s.supply_voltage} ${s.pot} ${s.temperature}`} class="setting" action={at} method="get">
      {quantity && <input type="hidden" name="quantity" value={quantity} />}
      <label>supply, V <input name="supply" inputMode="decimal" size={6} defaultValue={typed.supply || String(s.supply_voltage)} /></label>
      {s.pot !== undefined && <label>{d.along === "pot_position" ? "pot, share" : "pot, Ω"} <input name="pot" size={7} defaultValue={typed.pot || pot} /></label>}
      <label>ambient, °C <input name="temperature" inputMode="text" size={5} defaultValue={typed.temperature || String(s.temperature)} /></label>
      <button type="submit" class="quiet">Compute there</button>
    </form>
  );
}

function Values({ d, quantities }: { d: BoardDetail; quantities: readonly Quantity[] }) {
  return (
    <table class="values">
      <caption class="spoken">Predicted values and their 95{nbsp}% intervals</caption>
      <thead><tr><th scope="col">quantity</th><th scope="col" class="r">predicted</th><th scope="col" class="r">95{nbsp}% from</th><th scope="col" class="r">to</th></tr></thead>
      <tbody>{quantities.filter((q) => d.values[q]).map((q) => {
        const p = d.values[q]!;
        return <tr key={q}><th scope="row">{named(q)}</th><td class="r">{format(p.value, p.unit, 4)}</td><td class="r">{format(p.low, p.unit, 4)}</td><td class="r">{format(p.high, p.unit, 4)}</td></tr>;
      })}</tbody>
    </table>
  );
}

/** What a plan over these settings would be told. */
function Told({ d }: { d: BoardDetail }) {
  return (
    <>
      <h2>What a plan would be told</h2>
      {!d.findings.length && <p>Nothing: no rating is above 70{nbsp}%, and no setting looked at is flagged.</p>}
      <ul class="log findings">{d.findings.map((f) => (
        <li key={f.name + f.words}><span class="k">{f.refuse ? "refused" : "caution"}</span><span><i>{named(f.name)}</i>: {bound(f.words.replace(/\.$/, ""))}; {settingAt(d, f.setting)}{f.count > 1 ? `, and ${f.count - 1} more` : ""}.</span></li>
      ))}</ul>
    </>
  );
}

function Others({ boards, chosen }: { boards: readonly Board[]; chosen: string }) {
  if (!boards.length) return null;
  return (
    <>
      <h2>{boards.length === 1 ? "Measured here" : "Boards measured here"}</h2>
      <ul class="plainlist">{boards.map((b) => (
        <li key={b.hash}>
          <p>{b.hash === chosen && boards.length === 1 ? boardNamed(b) : <a href={`/boards/${b.hash}`} aria-current={b.hash === chosen ? "true" : undefined}>{boardNamed(b)}</a>}{b.serials.length > 0 && `, serial ${listed(b.serials)}`}. {count(b.runs.length, "run")}, last on {date(b.last_run)}.</p>
          <p class="sub">From <span class="q">{b.file}</span> as the run had it; SHA-256 <span class="hash">{b.hash.slice(0, 12)}…</span></p>
          <p>{b.runs.slice(0, 6).map((r, i) => <span key={r}>{i > 0 && ", "}<a href={`/runs/${r}`}>run {r}</a></span>)}{b.runs.length > 6 && ` and ${b.runs.length - 6} older`}</p>
        </li>
      ))}</ul>
    </>
  );
}
