// The one owner of the socket: it connects, says hello, parses, and comes back
// by itself after the last entry seen. Everything else sees entries and vitals.
import { type Entry, lean, type StreamMessage, type Vitals } from "./nouns";

/** Waits before trying again; the last one holds for ever. */
export const retries = [500, 1_000, 2_000, 5_000];
/** Without a word for this long the line is opened anew: a cable may be out without the socket knowing. */
export const silence = 10_000;
/** Without a word for this long the page says that it is not live. */
export const stale = 15_000;

export interface Heard {
  entry(e: Entry): void;
  vitals(v: Vitals): void;
  /** The replay has reached the tail, whose seq this is. */
  caughtUp(seq: number): void;
  /** The line was lost; `last` is when something was last heard, in ms of `now`. */
  lost(last: number): void;
  live(): void;
}

/** The part of a WebSocket that is used, so that a test can stand in. */
export interface Socket {
  onopen: ((e: never) => void) | null;
  onmessage: ((e: { data: unknown }) => void) | null;
  onclose: ((e: never) => void) | null;
  send(text: string): void;
  close(): void;
}

export interface Options {
  token: string;
  /** The newest entry seen, or −1: from the start of the newest run. */
  cursor: () => number;
  heard: Heard;
  open?: (path: string) => Socket;
  now?: () => number;
}

export interface Stream {
  /** Tries at once: the network is back, or the page is looked at again. */
  wake(): void;
  /** Opens the line anew, after the cursor was moved. */
  restart(): void;
  close(): void;
}

export function openStream(o: Options): Stream {
  const now = o.now ?? Date.now;
  const open = o.open ?? browserSocket;
  let socket: Socket | null = null;
  let timer: ReturnType<typeof setTimeout> | undefined;
  let failures = 0;
  let last = now();
  let live = false;
  let closed = false;

  function connect() {
    clearTimeout(timer);
    drop();
    const mine = open(`/api/stream?after=${o.cursor()}`);
    socket = mine;
    mine.onopen = () => mine.send(JSON.stringify({ token: o.token }));
    mine.onmessage = (e) => mine === socket && hear(e.data);
    mine.onclose = () => mine === socket && gone();
    timer = setTimeout(gone, silence); // neither opened nor closed
  }

  function hear(data: unknown) {
    const m = parse(data);
    if (!m) return;
    last = now();
    failures = 0;
    clearTimeout(timer);
    timer = setTimeout(quiet, silence);
    if (!live) {
      live = true;
      o.heard.live();
    }
    if (m.kind === "entry") o.heard.entry(m.entry.point ? { ...m.entry, point: lean(m.entry.point) } : m.entry);
    else if (m.kind === "vitals") o.heard.vitals(m.vitals);
    else o.heard.caughtUp(m.seq);
  }

  // Nothing was said for a while: ask anew without alarming anyone; the server greets a new line at once.
  function quiet() {
    connect();
    timer = setTimeout(gone, stale - silence);
  }

  function gone() {
    drop();
    if (closed) return;
    live = false;
    o.heard.lost(last);
    const wait = retries[Math.min(failures++, retries.length - 1)];
    clearTimeout(timer);
    timer = setTimeout(connect, wait);
  }

  function drop() {
    const old = socket;
    socket = null;
    if (!old) return;
    old.onopen = old.onmessage = old.onclose = null;
    old.close();
  }

  connect();
  return {
    wake() {
      if (closed) return;
      if (!live) connect();
      else if (now() - last > silence) quiet();
    },
    restart: connect,
    close() {
      closed = true;
      clearTimeout(timer);
      drop();
    },
  };
}

/** A message of the stream, or null for what this page does not know. */
export function parse(data: unknown): StreamMessage | null {
  if (typeof data !== "string") return null;
  try {
    const m = JSON.parse(data) as Partial<StreamMessage> | null;
    switch (m?.kind) {
      case "entry": return m.entry ? (m as StreamMessage) : null;
      case "vitals": return m.vitals ? (m as StreamMessage) : null;
      case "caught_up": return typeof m.seq === "number" ? (m as StreamMessage) : null;
      default: return null;
    }
  } catch {
    return null;
  }
}

function browserSocket(path: string): Socket {
  const scheme = location.protocol === "https:" ? "wss:" : "ws:";
  return new WebSocket(`${scheme}//${location.host}${path}`) as Socket;
}
