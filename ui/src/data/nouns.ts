// The nouns of the work as the page uses them. They are the wire's own (see
// api.ts), save that a list the wire may leave null is an empty list here:
// `tidy…` makes that so, once, at the edge.

export type Quantity = string;
export type Direction = "up" | "down" | "both" | "shuffled" | "";
export type Energised = "yes" | "no" | "unconfirmed";
export type State =
  | "preparing" | "running" | "held" | "asking" | "making_safe"
  | "done" | "stopped" | "tripped" | "failed" | "interrupted";

/** One combination of settings; index counts from 0 over the whole plan. */
export interface Setpoint {
  index: number;
  supply_voltage: number; // V, as set
  pot_code: number;
  pot_resistance: number; // Ω, of the code
  direction: Direction;
  pass: number;
  recheck?: boolean;
}

export interface Flag { name: string; words: string }

/** value and u are null together: then a flag says why. */
export interface Reading {
  quantity: Quantity;
  value: number | null;
  u: number | null;
  dof?: number | null;
  unit: string;
  road: string;
  flags: Flag[];
}

export interface Prediction { value: number; low: number; high: number; unit: string }

export interface Point {
  setpoint: Setpoint;
  at: string;
  elapsed: number; // s of bench time
  readings: Reading[];
  predictions: Record<Quantity, Prediction>;
  flags: Flag[];
}

export interface Curve {
  supply_voltage: number;
  pot_resistance: number[];
  quantities: Record<Quantity, CurveOfQuantity>;
}

/** Nulls stand where the board does not oscillate. */
export interface CurveOfQuantity {
  unit: string;
  value: (number | null)[];
  low: (number | null)[];
  high: (number | null)[];
}

export interface Off {
  confirmed: boolean;
  by: string[];
  voltage?: number | null;
  below: number;
  at: string;
  words: string;
}

export type Kind = "started" | "state" | "energising" | "off" | "point" | "log" | "trip" | "ended";

/** One line of the journal. */
export interface Entry {
  seq: number;
  run: number;
  at: string;
  elapsed: number;
  kind: Kind;
  words?: string;
  state?: State;
  point?: Point | null;
  curves?: Curve[];
  setpoints?: Setpoint[];
  off?: Off | null;
}

export interface Answering { name: string; words: string }

export interface Vitals {
  at: string;
  energised: Energised;
  since?: string | null;
  confirmed_by?: string[];
  supply_voltage?: number | null;
  supply_current?: number | null;
  supply_voltage_u?: number | null;
  supply_current_u?: number | null;
  read_at?: string | null;
  run: number;
  state?: State | "";
  doing: string;
  detail: string;
  setpoint?: Setpoint | null;
  repeat: number;
  repeats: number;
  planned: number;
  measured: number;
  flagged: number;
  time_left?: number | null; // s of wall time
  safe_by?: string | null;
  instruments: Answering[];
  watchers: number;
}

export interface File { role: string; name: string; sha256: string; text: string }

export interface Run {
  id: number;
  state: State;
  reason: string;
  plan: string;
  board: string;
  revision: string;
  board_serial: string;
  bench: string;
  operator: string;
  note: string;
  started_at: string;
  ended_at?: string | null;
  planned: number;
  measured: number;
  flagged: number;
  pace: number;
  seed: number;
  version: string;
  quantities: Quantity[];
  files: File[];
  instruments: string[];
}

/** One raw waveform: volts = code × volts_per_code + volts_at_zero. */
export interface Wave {
  node: string;
  channel: number;
  start: number; // s from the trigger
  interval: number; // s
  volts_per_code: number;
  volts_at_zero: number;
  codes: number[];
}

export interface Status {
  version: string;
  practice: boolean;
  pace: number;
  bench: string;
  may_control: boolean;
  cautions: string[];
  started_at: string;
}

export interface Instrument {
  name: string;
  role: string;
  address: string;
  identity: { maker: string; model: string; serial: string; firmware: string; raw: string };
  dialect: string;
}

export interface Wiring {
  bench: string;
  practice: boolean;
  supply: { between: string[]; max_voltage: number; max_current: number; over_voltage: number; fuse: number };
  meters: { name: string; reads: string; between: string[]; burden: number; calibrated: string; due: string }[];
  scope?: { earthed: boolean; channels: { number: number; between: string[]; probe: number }[] } | null;
  pot?: { codes: number; end_to_end: number; tolerance: number; wiper: number; max_terminal_voltage: number; max_current: number; park: number } | null;
}

export interface Bench { wiring: Wiring; instruments: Instrument[] }

type Loose<T> = { [K in keyof T]: T[K] extends unknown[] ? T[K] | null : T[K] };

/** Drops the raw replies too: a page left open all night keeps only what it draws. */
export function tidyPoint(p: Loose<Point>): Point {
  return {
    setpoint: p.setpoint,
    at: p.at,
    elapsed: p.elapsed,
    predictions: p.predictions ?? {},
    flags: p.flags ?? [],
    readings: (p.readings ?? []).map((r) => ({
      quantity: r.quantity, value: r.value, u: r.u, dof: r.dof, unit: r.unit, road: r.road, flags: r.flags ?? [],
    })),
  };
}

export function tidyEntry(e: Entry): Entry {
  return {
    ...e,
    point: e.point ? tidyPoint(e.point) : null,
    off: e.off ? { ...e.off, by: e.off.by ?? [] } : null,
    curves: e.curves ?? [],
    setpoints: e.setpoints ?? [],
  };
}

export function tidyVitals(v: Loose<Vitals>): Vitals {
  return { ...v, instruments: v.instruments ?? [], confirmed_by: v.confirmed_by ?? [] } as Vitals;
}

export function tidyRun(r: Loose<Run>): Run {
  return { ...r, quantities: r.quantities ?? [], files: r.files ?? [], instruments: r.instruments ?? [] } as Run;
}

export function flagged(p: Point): boolean {
  return p.flags.length > 0 || p.readings.some((r) => r.flags.length > 0);
}

export function reading(p: Point, q: Quantity): Reading | undefined {
  return p.readings.find((r) => r.quantity === q);
}

const over: ReadonlySet<string> = new Set(["done", "stopped", "tripped", "failed", "interrupted"]);

export function ended(s: string | undefined): boolean {
  return s !== undefined && over.has(s);
}
