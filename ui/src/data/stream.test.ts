import { afterEach, beforeEach, expect, test, vi } from "vitest";
import { entries, vitals } from "./fixture";
import type { Entry, Vitals } from "./nouns";
import { openStream, parse, retries, silence, type Socket, stale } from "./stream";

class Line implements Socket {
  onopen: ((e: never) => void) | null = null;
  onmessage: ((e: { data: unknown }) => void) | null = null;
  onclose: ((e: never) => void) | null = null;
  sent: string[] = [];
  closed = false;
  constructor(readonly path: string) {}
  send(text: string) {
    this.sent.push(text);
  }
  close() {
    this.closed = true;
  }
  say(m: unknown) {
    this.onmessage?.({ data: JSON.stringify(m) });
  }
}

function setUp() {
  const lines: Line[] = [];
  const log: string[] = [];
  let cursor = -1;
  const stream = openStream({
    token: "secret",
    cursor: () => cursor,
    open: (path) => (lines.push(new Line(path)), lines[lines.length - 1]!),
    heard: {
      entry: (e: Entry) => ((cursor = e.seq), log.push(`entry ${e.seq}`)),
      vitals: (v: Vitals) => log.push(`vitals ${v.measured}`),
      caughtUp: () => log.push("caught up"),
      lost: (last) => log.push(`lost ${last}`),
      live: () => log.push("live"),
    },
  });
  return { stream, lines, log, newest: () => lines[lines.length - 1]! };
}

beforeEach(() => void vi.useFakeTimers({ now: 1_000_000 }));
afterEach(() => void vi.useRealTimers());

test("says hello with the token, never in the address", () => {
  const { lines, stream } = setUp();
  lines[0]!.onopen?.(undefined as never);
  expect(lines[0]!.path).toBe("/api/stream?after=-1");
  expect(lines[0]!.sent).toEqual(['{"token":"secret"}']);
  stream.close();
});

test("comes back after the last entry seen, waiting longer each time", () => {
  const { lines, log, newest, stream } = setUp();
  newest().say({ kind: "entry", entry: entries[0] });
  newest().say({ kind: "entry", entry: entries[1] });
  newest().onclose?.(undefined as never);
  expect(log).toEqual(["live", "entry 1", "entry 2", "lost 1000000"]);
  for (const wait of [...retries, retries[retries.length - 1]!]) {
    const n = lines.length;
    vi.advanceTimersByTime(wait - 1);
    expect(lines).toHaveLength(n);
    vi.advanceTimersByTime(1);
    expect(lines).toHaveLength(n + 1);
    expect(newest().path).toBe("/api/stream?after=2");
    newest().onclose?.(undefined as never);
  }
  stream.close();
});

test("a silent line is asked anew before anyone is alarmed", () => {
  const { lines, log, newest, stream } = setUp();
  newest().say({ kind: "vitals", vitals });
  vi.advanceTimersByTime(silence);
  expect(lines).toHaveLength(2);
  expect(lines[0]!.closed).toBe(true);
  expect(log).toEqual(["live", "vitals 31"]);
  newest().say({ kind: "vitals", vitals });
  vi.advanceTimersByTime(silence - 1);
  expect(log).toEqual(["live", "vitals 31", "vitals 31"]);
  stream.close();
});

test("a dead line is said to be not live, since it was last heard", () => {
  const { log, newest, stream } = setUp();
  newest().say({ kind: "vitals", vitals });
  vi.advanceTimersByTime(stale);
  expect(log).toEqual(["live", "vitals 31", "lost 1000000"]);
  stream.close();
});

test("the old line is not listened to once a new one is open", () => {
  const { lines, log, stream } = setUp();
  const first = lines[0]!;
  const hear = first.onmessage!;
  stream.restart();
  hear({ data: JSON.stringify({ kind: "vitals", vitals }) });
  expect(log).toEqual([]);
  stream.close();
});

test("waking tries at once when the line was lost", () => {
  const { lines, newest, stream } = setUp();
  newest().onclose?.(undefined as never);
  stream.wake();
  expect(lines).toHaveLength(2);
  stream.close();
  stream.wake();
  vi.advanceTimersByTime(60_000);
  expect(lines).toHaveLength(2);
});

test.each([["text", "not JSON"], ["null", null], ["a number", 3], ["an unknown kind", '{"kind":"advice"}'], ["an empty entry", '{"kind":"entry"}'], ["a bad seq", '{"kind":"caught_up","seq":"9"}']])("%s on the line is passed over", (_, data) => {
  expect(parse(data)).toBeNull();
});
