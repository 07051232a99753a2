// Now: what the bench does this minute. Finished passes in ink, coming ones pencil only.
import { useEffect, useState } from "preact/hooks";
import { underWay } from "../data/bench";
import type { Client } from "../data/client";
import type { Waveforms } from "../data/nouns";
import { bound, clockSeconds, date, format, nbsp } from "../data/format";
import { quantitiesOf } from "../data/night";
import { doingNow, headline, sentence, tallied } from "../data/words";
import { Alarm } from "../parts/alarm";
import { Figure, type Now } from "../parts/figure";
import { AlsoHere, Instruments } from "../parts/instruments";
import { Log } from "../parts/margin";
import { Picker } from "../parts/picker";
import { Trace } from "../parts/trace";
import type { Views } from "./page";

/** Lines of the log shown beside the figure; the rest is on the run's page. */
const linesShown = 18;

export function NowView({ bench, client, place }: Views) {
  const v = bench.vitals.value;
  const night = bench.night.value;
  const link = bench.link.value;
  const stale = link.state === "lost";
  const alarmed = v?.energised === "unconfirmed";
  const open = underWay(v) && v?.run === night.run;
  return (
    <div class="leaf">
      <main>
        {alarmed ? <Alarm bench={bench} heading /> : <Headline {...{ bench, client, place }} />}
        {alarmed && night.points.length > 0 && <p class="sub">{night.points.length} points are kept. Nothing resumes by itself.</p>}
        {!alarmed && <Drawn {...{ bench, client, place }} />}
      </main>
      <aside class="margin" aria-label="Log">
        <Log lines={night.log} most={linesShown} all={night.run ? `/runs/${night.run}` : undefined} now={open && v ? doingNow(v) : undefined} nowAt={v?.at} />
        <Instruments vitals={v} stale={stale} />
        <AlsoHere vitals={v} stale={stale} />
      </aside>
    </div>
  );
}

function Headline({ bench }: Views) {
  const v = bench.vitals.value;
  const link = bench.link.value;
  const run = bench.run.value;
  if (link.state === "lost") {
    const was = v?.doing ? `: ${lower(doingNow(v))}` : "";
    return (
      <>
        <h1 tabIndex={-1}>{v ? `Last heard at ${clockSeconds(link.since)}${was}` : "The bench does not answer"}</h1>
        <p class="sub">{v ? "Everything here is as it was then. It fills in by itself when the bench answers." : "This page fills in by itself when it does."}</p>
      </>
    );
  }
  if (v && underWay(v)) return <><h1 tabIndex={-1}>{doingNow(v)}</h1><p class="sub">{bound(v.detail)}</p></>;
  if (!v || (!bench.caughtUp.value && !run)) return <><h1 tabIndex={-1}>Waiting for the bench</h1><p class="sub">It says at once where it stands.</p></>;
  if (!run) return <><h1 tabIndex={-1}>{headline(null)}</h1><p class="sub">A run is started with <span class="q">nightbench start PLAN</span>; it appears here by itself.</p></>;
  return (
    <>
      <h1 tabIndex={-1}>{headline(run)}</h1>
      <p class="sub">{[run.reason && sentence(run.reason), tallied({ ...run, measured: bench.night.value.points.length || run.measured }), run.ended_at && `It ended on ${date(run.ended_at)}.`].filter(Boolean).join(" ")}</p>
    </>
  );
}

function Drawn({ bench, client, place }: Views) {
  const v = bench.vitals.value;
  const night = bench.night.value;
  const stale = bench.link.value.state === "lost";
  const quantities = quantitiesOf(night.points, night.curves, bench.run.value?.id === night.run ? bench.run.value.quantities : []);
  const record = useRecord(client, night.run, night.points.length);
  if (!quantities.length) return null;
  const chosen = quantities.includes(place.quantity) ? place.quantity : quantities[0]!;
  const now: Now | null = underWay(v) && v?.run === night.run && v.setpoint ? { setpoint: v.setpoint, repeat: v.repeat, repeats: v.repeats, word: stale ? "then" : "now" } : null;
  return (
    <>
      <Picker quantities={quantities} chosen={chosen} at="/" />
      <Figure quantity={chosen} points={night.points} curves={night.curves} setpoints={night.setpoints} now={now} />
      {record && (
        <>
          <h2>The board’s output, newest record</h2>
          <Trace record={record} point={night.points.find((p) => p.setpoint.index === record.point) ?? null} />
        </>
      )}
    </>
  );
}

/** The newest record is asked for after points came, not more often than this (ms). */
const recordEvery = 5_000;

function useRecord(client: Client, run: number, points: number): Waveforms | null {
  const [got, setGot] = useState<{ run: number; at: number; asked: number; record: Waveforms | null }>({ run: 0, at: -1, asked: 0, record: null });
  useEffect(() => {
    if (!run || !points || (got.run === run && got.at === points)) return;
    const wait = got.run === run ? Math.max(0, got.asked + recordEvery - Date.now()) : 0;
    let wanted = true;
    const t = setTimeout(async () => {
      const record = await client.record(run).catch(() => (got.run === run ? got.record : null));
      if (wanted) setGot({ run, at: points, asked: Date.now(), record });
    }, wait);
    return () => {
      wanted = false;
      clearTimeout(t);
    };
  }, [client, run, points, got]);
  return got.run === run ? got.record : null;
}

function lower(s: string): string {
  return s.charAt(0).toLowerCase() + s.slice(1);
}

/** "Pace 20 ×", for a run's facts. */
export function paceOf(p: number): string {
  return p === 1 ? "" : `Practice bench at ${format(p, "1", 3)}${nbsp}×${nbsp}speed.`;
}
