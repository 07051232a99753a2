// Requests to the daemon. Failures come back as sentences: what, where, why, what to try.
import { type Bench, type Curve, type Entry, type Off, type Point, type Run, type Setpoint, type Status, tidyEntry, tidyPoint, tidyRun, type Vitals, type Wave } from "./nouns";

/** A failed request. Status 0: it did not get through at all. */
export class Failure extends Error {
  constructor(readonly status: number, words: string) {
    super(words);
  }
}

export interface Whole { run: Run; setpoints: Setpoint[]; curves: Curve[] }
export interface NewestRecord { point: number; at: string; records: Wave[] }

export interface Client {
  status(): Promise<Status & { vitals: Vitals }>;
  runs(): Promise<Run[]>;
  run(id: number): Promise<Whole>;
  points(id: number): Promise<Point[]>;
  log(id: number): Promise<Entry[]>;
  record(id: number, point?: number): Promise<NewestRecord | null>;
  bench(): Promise<Bench>;
  off(): Promise<Off>;
}

/** How long a request may take. Making safe waits for the board to bleed down. */
const patience = 15_000;
const offPatience = 60_000;

export function newClient(token: string, fetcher: typeof fetch = (...a) => fetch(...a)): Client {
  const get = async <T>(path: string) => ask<T>(fetcher, token, path, { method: "GET" }, patience);
  return {
    async status() {
      const s = await get<Status & { vitals: Vitals }>("/api/status");
      return { ...s, cautions: s.cautions ?? [] };
    },
    async runs() {
      return ((await get<{ runs: Run[] | null }>("/api/runs")).runs ?? []).map(tidyRun);
    },
    async run(id) {
      const w = await get<Whole>(`/api/runs/${id}`);
      return { run: tidyRun(w.run), setpoints: w.setpoints ?? [], curves: w.curves ?? [] };
    },
    async points(id) {
      return ((await get<{ points: Point[] | null }>(`/api/runs/${id}/points`)).points ?? []).map(tidyPoint);
    },
    async log(id) {
      return ((await get<{ entries: Entry[] | null }>(`/api/runs/${id}/log`)).entries ?? []).map(tidyEntry);
    },
    async record(id, point) {
      try {
        const r = await get<NewestRecord>(`/api/runs/${id}/record${point === undefined ? "" : `?point=${point}`}`);
        return { ...r, records: r.records ?? [] };
      } catch (e) {
        if (e instanceof Failure && e.status === 404) return null;
        throw e;
      }
    },
    async bench() {
      const b = await get<Bench>("/api/bench");
      return { wiring: { ...b.wiring, meters: b.wiring.meters ?? [] }, instruments: b.instruments ?? [] };
    },
    async off() {
      const body = JSON.stringify({ by: "the page" });
      const off = await ask<Off>(fetcher, token, "/api/off", { method: "POST", body, headers: { "Content-Type": "application/json" } }, offPatience);
      return { ...off, by: off.by ?? [] };
    },
  };
}

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
