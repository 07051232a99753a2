// A stream, for tests: 31 points of a made-up night (dev/practice.mjs, recorded by dev/record.mjs), then the newest vitals.
import { readFileSync } from "node:fs";
import { applyAll, type Night, noNight } from "./night";
import type { BoardDetail, Entry, StreamMessage, Vitals } from "./nouns";
import type { BenchModel } from "./bench";
import { newBench } from "./bench";
import type { Client } from "./client";
import type { Heard } from "./stream";

const messages = JSON.parse(readFileSync("src/data/fixture/night.json", "utf8")) as StreamMessage[];

export const entries: Entry[] = messages.flatMap((m) => (m.kind === "entry" ? [m.entry] : []));
export const vitals: Vitals = messages.find((m) => m.kind === "vitals")!.vitals;
export const night: Night = applyAll(noNight, entries);

/** The example board as a daemon computed it at 9 V and 9.1 k, every fourth point of four quantities. */
export const board = JSON.parse(readFileSync("src/data/fixture/board.json", "utf8")) as BoardDetail;

/** A bench model whose stream is played by hand. */
export function playedBench(client: Partial<Client> = {}, token = "t"): { bench: BenchModel; heard: Heard; cursor: () => number; restarts: () => number } {
  let heard!: Heard;
  let cursor!: () => number;
  let restarts = 0;
  const absent = () => Promise.reject(new Error("not asked for in this test"));
  const all: Client = { status: absent, runs: absent, run: absent, points: absent, log: absent, record: absent, bench: absent, boards: absent, board: absent, off: absent, ...client };
  const bench = newBench(all, token, (o) => {
    heard = o.heard;
    cursor = o.cursor;
    return { wake() {}, restart: () => void restarts++, close() {} };
  });
  return { bench, heard, cursor: () => cursor(), restarts: () => restarts };
}
