// The page's model: read-only signals out, named actions in. Parts look at the
// signals; nothing but this module changes them.
import { computed, type ReadonlySignal, signal } from "@preact/signals";
import { type Client, Failure } from "./client";
import { applyAll, type Night, noNight } from "./night";
import { ended, type Entry, type Run, type Status, type Vitals } from "./nouns";
import { openStream, type Stream } from "./stream";
import { clockSeconds } from "./format";
import { type Link, offOutcome, standing, type Standing } from "./words";

/** Entries are taken in together this often (ms), so that a replay is drawn once. */
const gather = 40;

/** What pressing "Outputs off" brought, in words. */
export interface Outcome { words: string; caution: boolean; pending: boolean; at: number }

export interface BenchModel {
  readonly link: ReadonlySignal<Link>;
  readonly status: ReadonlySignal<Status | null>;
  readonly vitals: ReadonlySignal<Vitals | null>;
  readonly night: ReadonlySignal<Night>;
  /** The newest run's head: names, serial, note. */
  readonly run: ReadonlySignal<Run | null>;
  readonly caughtUp: ReadonlySignal<boolean>;
  readonly standing: ReadonlySignal<Standing>;
  readonly mayControl: ReadonlySignal<boolean>;
  readonly outcome: ReadonlySignal<Outcome | null>;
  switchOff(): Promise<void>;
  wake(): void;
  close(): void;
}

type OpenStream = typeof openStream;

export function newBench(client: Client, token: string, open: OpenStream = openStream): BenchModel {
  const link = signal<Link>({ state: "connecting" });
  const status = signal<Status | null>(null);
  const vitals = signal<Vitals | null>(null);
  const night = signal<Night>(noNight);
  const run = signal<Run | null>(null);
  const caughtUp = signal(false);
  const outcome = signal<Outcome | null>(null);

  let waiting: Entry[] = [];
  let timer: ReturnType<typeof setTimeout> | undefined;

  function takeIn() {
    clearTimeout(timer);
    timer = undefined;
    if (!waiting.length) return;
    const before = night.value;
    const after = applyAll(before, waiting);
    waiting = [];
    night.value = after;
    if (after.run !== before.run || after.state !== before.state || !run.value) void lookUpRun(after.run);
  }

  async function lookUpRun(id: number) {
    if (!id) return;
    try {
      const whole = await client.run(id);
      if (night.value.run === id) run.value = whole.run;
    } catch {
      if (run.value?.id !== id) run.value = null; // the stream still says what matters
    }
  }

  async function lookUpStatus() {
    try {
      const s = await client.status();
      const before = status.value;
      status.value = s;
      vitals.value ??= s.vitals;
      if (before && before.started_at !== s.started_at) await sameJournal();
    } catch {
      return; // asked again with the next connection
    }
  }

  // A daemon that was started anew may keep another journal, whose numbers mean nothing here.
  async function sameJournal() {
    const known = run.value;
    if (!known) return;
    try {
      if ((await client.run(known.id)).run.started_at === known.started_at) return;
    } catch (e) {
      if (!(e instanceof Failure) || e.status !== 404) return;
    }
    forget();
    stream.restart();
  }

  function forget() {
    waiting = [];
    night.value = noNight;
    run.value = null;
  }

  const cursor = () => waiting[waiting.length - 1]?.seq ?? night.value.seq;

  const stream: Stream = open({
    token,
    cursor,
    heard: {
      entry(e) {
        if (e.seq <= cursor()) forget(); // one journal never goes back: this is another one
        waiting.push(e);
        timer ??= setTimeout(takeIn, gather);
      },
      vitals(v) {
        vitals.value = v;
        if (outcome.value && over(outcome.value, v)) outcome.value = null;
      },
      caughtUp(seq) {
        if (seq < cursor()) forget();
        takeIn();
        caughtUp.value = true;
      },
      lost(last) {
        link.value = { state: "lost", since: new Date(last).toISOString() };
      },
      live() {
        link.value = { state: "live" };
        void lookUpStatus();
      },
    },
  });

  async function switchOff() {
    if (!token || status.value?.may_control === false) {
      outcome.value = { words: watcherWords, caution: false, pending: false, at: Date.now() };
      return;
    }
    outcome.value = { words: `Off is sent (${clockSeconds(new Date())}); waiting for the supply to confirm it.`, caution: false, pending: true, at: Date.now() };
    try {
      const off = await client.off();
      outcome.value = { words: offOutcome(off), caution: !off.confirmed, pending: false, at: Date.parse(off.at) || Date.now() };
    } catch (e) {
      const why = e instanceof Failure ? e.message : String(e);
      outcome.value = { words: `Off did not get through: ${why} Use the switch at the bench.`, caution: true, pending: false, at: Date.now() };
    }
  }

  return {
    link, status, vitals, night, run, caughtUp, outcome,
    standing: computed(() => standing(vitals.value, link.value)),
    mayControl: computed(() => token !== "" && status.value?.may_control !== false),
    switchOff,
    wake: () => stream.wake(),
    close() {
      clearTimeout(timer);
      stream.close();
    },
  };
}

/** Why the button does nothing for someone who only watches. */
export const watcherWords =
  "This page watches; it has no operator’s token, so “Outputs off” can’t act from here. Open the address that the daemon printed, or use the switch at the bench.";

/** How long the outcome of a press stays beside the state that says the same, ms. */
const outcomeStays = 60_000;

// An outcome is over when it has stood long enough, or when the output's state is newer than it.
// One that calls for the switch at the bench stays until off is confirmed.
function over(o: Outcome, v: Vitals): boolean {
  if (o.pending) return false;
  const newer = !!v.since && Date.parse(v.since) > o.at;
  return o.caution ? newer && v.energised === "no" : Date.parse(v.at) > o.at + outcomeStays || (newer && v.energised === "yes");
}

/** Whether the newest run is still going on. */
export function underWay(v: Vitals | null): boolean {
  return !!v && v.run !== 0 && !ended(v.state);
}
