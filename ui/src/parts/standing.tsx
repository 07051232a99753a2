// The standing lines, on every view: the word for energised with its evidence, then
// run, points and time left, then the tally, and "Outputs off" at the right.
import { useEffect, useState } from "preact/hooks";
import { type BenchModel, watcherWords } from "../data/bench";
import { clockSeconds } from "../data/format";
import { ended } from "../data/nouns";
import { briefProgress, progress, type Standing as Sentence } from "../data/words";
import { OutputsOff } from "./off";
import { Tally } from "./tally";

export function Standing({ bench }: { bench: BenchModel }) {
  const s = bench.standing.value;
  const v = bench.vitals.value;
  const night = bench.night.value;
  const link = bench.link.value;
  const name = bench.status.value?.bench ?? "";
  const over = ended(night.state || undefined);
  const outcome = bench.outcome.value;
  return (
    <section class="standing" aria-label="State">
      <div class="row">
        <div class="say">
          <p>
            <strong class={s.caution ? "caution" : undefined}>{s.word}</strong> {s.evidence}
            {s.live && <>; supply reads <span class="q">{s.live}</span>{v?.read_at ? ` at ${clockSeconds(v.read_at)}` : ""}.</>}
          </p>
          <p class="sub">{progress(v, link, name)}</p>
          {outcome && <p class={outcome.caution ? "outcome caution" : "outcome"} role={outcome.caution ? "alert" : undefined}>{outcome.words}</p>}
          {!outcome && !bench.mayControl.value && <p class="sub">{watcherWords}</p>}
        </div>
        <OutputsOff bench={bench} brief={outcome ? [outcome.words] : [s.brief, link.state === "lost" ? lastHeard(v?.energised) : briefProgress(v)]} />
      </div>
      {night.setpoints.length > 0 && !over && <Tally setpoints={night.setpoints} points={night.points} now={v?.setpoint?.index ?? null} over={over} />}
      <Spoken sentence={s} outcome={outcome?.words ?? ""} />
    </section>
  );
}

function lastHeard(energised: string | undefined): string {
  return energised === "yes" ? "last heard: energised" : energised === "no" ? "last heard: not energised" : "";
}

/** How often the standing sentence may be spoken, ms. */
const spokenEvery = 15_000;

// The sentence for those who listen: without the live reading, and not more often than every 15 s.
function Spoken({ sentence, outcome }: { sentence: Sentence; outcome: string }) {
  const words = [sentence.word, sentence.evidence, outcome].filter(Boolean).join(" ");
  const said = useSlow(words, spokenEvery);
  return <p class="spoken" aria-live="polite">{said}</p>;
}

/** The newest value, changed at most once in `every` ms. */
export function useSlow<T>(value: T, every: number): T {
  const [shown, setShown] = useState({ value, at: 0 });
  useEffect(() => {
    if (value === shown.value) return;
    const wait = Math.max(0, shown.at + every - Date.now());
    const t = setTimeout(() => setShown({ value, at: Date.now() }), wait);
    return () => clearTimeout(t);
  }, [value, shown, every]);
  return shown.value;
}
