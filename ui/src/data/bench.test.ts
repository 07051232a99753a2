import { afterEach, beforeEach, expect, test, vi } from "vitest";
import { watcherWords } from "./bench";
import { Failure } from "./client";
import { entries, night, playedBench, vitals } from "./fixture";
import type { Off, Run, Status } from "./nouns";

beforeEach(() => void vi.useFakeTimers({ now: new Date("2026-12-01T02:14:03Z") }));
afterEach(() => void vi.useRealTimers());

const off: Off = { confirmed: true, by: ["supply", "meter average"], voltage: 0.021, below: 0.5, at: "2026-12-01T02:14:04Z", words: "" };
const run = { id: 41, state: "running", started_at: "2026-11-30T22:02:00Z" } as Run;

test("entries are taken in together; the run's head is looked up once", async () => {
  const asked = vi.fn(async () => ({ run, setpoints: [], curves: [] }));
  const { bench, heard, cursor } = playedBench({ run: asked });
  for (const e of entries) heard.entry(e);
  expect(bench.night.value.run).toBe(0);
  expect(cursor()).toBe(night.seq);
  await vi.advanceTimersByTimeAsync(100);
  expect(bench.night.value).toEqual(night);
  expect(bench.run.value).toEqual(run);
  expect(asked).toHaveBeenCalledTimes(1);
});

test.each([
  ["the same journal goes on", run.started_at, night.seq, 0],
  ["another journal at the same address is read from its start", "2026-12-01T00:00:00Z", -1, 1],
])("after the daemon was started anew, %s", async (_, startedAt, cursor, restarts) => {
  let born = "2026-11-30T22:00:00Z";
  let head = run;
  const played = playedBench({ status: async () => ({ started_at: born }) as Status, run: async () => ({ run: head, setpoints: [], curves: [] }) });
  played.heard.live();
  for (const e of entries) played.heard.entry(e);
  played.heard.caughtUp(night.seq);
  await vi.advanceTimersByTimeAsync(0);
  expect([played.cursor(), played.restarts()]).toEqual([night.seq, 0]);
  born = "2026-12-01T03:00:00Z";
  head = { ...run, started_at: startedAt };
  played.heard.live();
  await vi.advanceTimersByTimeAsync(0);
  expect([played.cursor(), played.restarts()]).toEqual([cursor, restarts]);
});

test.each([
  ["starts with a run", entries.slice(0, 3), entries[2]!.seq],
  ["is empty", [], -1],
])("a journal that has not reached the page's cursor is another one, before any run was known: it %s", async (_, replayed, cursor) => {
  const played = playedBench();
  for (const e of entries) played.heard.entry({ ...e, seq: e.seq + 10_000 });
  await vi.advanceTimersByTimeAsync(100);
  expect(played.bench.run.value).toBeNull();
  played.heard.caughtUp(played.cursor());
  expect(played.cursor()).toBe(night.seq + 10_000);
  for (const e of replayed) played.heard.entry(e);
  played.heard.caughtUp(replayed.at(-1)?.seq ?? 0);
  expect(played.cursor()).toBe(cursor);
  expect(played.bench.night.value.log.length).toBe(replayed.length);
});

test("Outputs off asks nothing and says what came of it", async () => {
  let answer!: (o: Off) => void;
  const { bench } = playedBench({ off: () => new Promise((r) => (answer = r)) });
  const pressed = bench.switchOff();
  expect(bench.outcome.value).toMatchObject({ pending: true, words: "Off is sent (02:14:03); waiting for the supply to confirm it." });
  answer(off);
  await pressed;
  expect(bench.outcome.value).toMatchObject({ pending: false, caution: false });
  expect(bench.outcome.value!.words.replaceAll("\u00a0", " ")).toBe("Off confirmed at 02:14:04 by supply and meter average: 21 mV, below 500 mV.");
});

test("an off that is not confirmed, or does not get through, says which switch", async () => {
  const unconfirmed = playedBench({ off: async () => ({ ...off, confirmed: false, words: "Turn the black switch." }) });
  await unconfirmed.bench.switchOff();
  expect(unconfirmed.bench.outcome.value).toMatchObject({ caution: true, words: "Off was sent and is not confirmed. Turn the black switch." });
  const lost = playedBench({ off: () => Promise.reject(new Failure(0, "The daemon did not answer.")) });
  await lost.bench.switchOff();
  expect(lost.bench.outcome.value).toMatchObject({ caution: true, words: "Off did not get through: The daemon did not answer. Use the switch at the bench." });
});

test("a watcher sees why the button can't act, and nothing is sent", async () => {
  const sent = vi.fn(async () => off);
  const { bench } = playedBench({ off: sent }, "");
  expect(bench.mayControl.value).toBe(false);
  await bench.switchOff();
  expect(sent).not.toHaveBeenCalled();
  expect(bench.outcome.value!.words).toBe(watcherWords);
});

test("a token that the daemon does not take is the same as none", async () => {
  const { bench, heard } = playedBench({ status: async () => ({ may_control: false, vitals }) as Status });
  expect(bench.mayControl.value).toBe(true);
  heard.live();
  await vi.advanceTimersByTimeAsync(0);
  expect(bench.mayControl.value).toBe(false);
});

const then = { ...vitals, at: "2026-12-01T02:14:30Z" };
test.each([
  ["stays while nothing is newer", true, { ...then, since: "2026-12-01T01:00:00Z" }, true],
  ["goes when the output is on again since", true, { ...then, since: "2026-12-01T02:14:20Z" }, false],
  ["goes after a minute", true, { ...then, energised: "no" as const, since: off.at, at: "2026-12-01T02:15:30Z" }, false],
  ["that calls for the switch stays", false, { ...then, energised: "unconfirmed" as const, at: "2026-12-01T04:00:00Z" }, true],
  ["that calls for the switch goes once off is confirmed", false, { ...then, energised: "no" as const, since: "2026-12-01T02:30:00Z" }, false],
])("an outcome %s", async (_, confirmed, heardThen, stays) => {
  const { bench, heard } = playedBench({ off: async () => ({ ...off, confirmed }) });
  await bench.switchOff();
  heard.vitals(heardThen);
  expect(bench.outcome.value !== null).toBe(stays);
});

test("not live is said since the last word, and ends with the next", () => {
  const { bench, heard } = playedBench();
  heard.live();
  heard.vitals(vitals);
  heard.lost(Date.parse("2026-12-01T01:58:07Z"));
  expect(bench.standing.value.word).toBe("Not live since 01:58:07.");
  heard.live();
  expect(bench.standing.value.word).toBe("Energised.");
});
