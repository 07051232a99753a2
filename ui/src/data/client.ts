// Requests to the daemon. Failures come back as sentences: what, where, why, what to try.
import type { paths } from "./api";
import { type Bench, type Board, type BoardDetail, type Entry, lean, type Off, type Point, type Run, type RunDetail, type Status, type Waveforms } from "./nouns";

/** A failed request. Status 0: it did not get through at all. */
export class Failure extends Error {
  constructor(readonly status: number, words: string) {
    super(words);
  }
}

export interface Client {
  status(): Promise<Status>;
  runs(): Promise<Run[]>;
  run(id: number): Promise<RunDetail>;
  points(id: number): Promise<Point[]>;
  log(id: number): Promise<Entry[]>;
  record(id: number): Promise<Waveforms | null>;
  bench(): Promise<Bench>;
  boards(): Promise<Board[]>;
  board(hash: string, at: Asked): Promise<BoardDetail>;
  off(): Promise<Off>;
}

/** Where a board is to be computed; what is left out the daemon chooses. */
export interface Asked { supply?: number; pot?: number; temperature?: number }

/** How long a request may take. Making safe waits for the board to bleed down. */
const patience = 15_000;
const offPatience = 60_000;
/** A board's curves are a thousand boards at every setting, and others may be before. */
const boardPatience = 45_000;

export function newClient(token: string, fetcher: typeof fetch = (...a) => fetch(...a)): Client {
  const get = <P extends Readable>(_: P, path: string, wait = patience) => ask<Answer<P>>(fetcher, token, path, { method: "GET" }, wait);
  return {
    status: () => get("/api/status", "/api/status"),
    bench: () => get("/api/bench", "/api/bench"),
    boards: async () => (await get("/api/boards", "/api/boards")).boards,
    board: (hash, at) => get("/api/boards/{hash}", `/api/boards/${hash}${query(at)}`, boardPatience),
    runs: async () => (await get("/api/runs", "/api/runs")).runs,
    run: (id) => get("/api/runs/{id}", `/api/runs/${id}`),
    points: async (id) => (await get("/api/runs/{id}/points", `/api/runs/${id}/points`)).points.map(lean),
    log: async (id) => (await get("/api/runs/{id}/log", `/api/runs/${id}/log`)).entries,
    async record(id) {
      try {
        return await get("/api/runs/{id}/record", `/api/runs/${id}/record`);
      } catch (e) {
        if (e instanceof Failure && e.status === 404) return null; // none was kept
        throw e;
      }
    },
    off() {
      const body = JSON.stringify({ by: "the page" });
      return ask<Off>(fetcher, token, "/api/off", { method: "POST", body, headers: { "Content-Type": "application/json" } }, offPatience);
    },
  };
}

function query(at: Asked): string {
  const q = Object.entries(at).flatMap(([k, v]) => (v === undefined ? [] : [`${k}=${v}`]));
  return q.length ? "?" + q.join("&") : "";
}

/** The paths that can be read, and what the description says they answer. */
type Readable = { [P in keyof paths]: paths[P]["get"] extends { responses: { 200: { content: { "application/json": unknown } } } } ? P : never }[keyof paths];
type Answer<P extends Readable> = paths[P]["get"] extends { responses: { 200: { content: { "application/json": infer T } } } } ? T : never;

async function ask<T>(fetcher: typeof fetch, token: string, path: string, init: RequestInit, wait: number): Promise<T> {
  const headers = new Headers(init.headers);
  if (token) headers.set("Authorization", `Bearer ${token}`);
  let answer: Response;
  try {
    answer = await fetcher(path, { ...init, headers, cache: "no-store", signal: AbortSignal.timeout(wait) });
  } catch {
    throw new Failure(0, "The daemon did not answer.");
  }
  if (!answer.ok) throw new Failure(answer.status, await problem(answer, path));
  return (await answer.json()) as T;
}

/** The sentence of an RFC 9457 problem, or what can be said without one. */
async function problem(answer: Response, path: string): Promise<string> {
  try {
    const p = (await answer.json()) as { detail?: string; title?: string };
    if (p.detail || p.title) return p.detail ?? p.title ?? "";
  } catch {
    // not a problem document: say what is known
  }
  return `${path} answered with status ${answer.status}.`;
}
