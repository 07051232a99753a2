// What a page knows of one run, built from the journal's entries in order of
// seq. Pure: the same entries give the same night, live or replayed.
import { type Curve, type Entry, ended, flagged, type Kind, type Off, type Point, type Quantity, type Setpoint, type State } from "./nouns";

/** The newest lines kept for the margin; older ones are on the run's own page. */
export const logKept = 400;

export interface Line {
  seq: number;
  at: string;
  kind: Kind;
  words: string;
  point: Point | null;
}

export interface Night {
  seq: number; // the newest entry seen: where to go on after the line was cut
  run: number; // 0: none yet
  state: State | "";
  startedAt: string;
  endedAt: string;
  reason: string;
  setpoints: readonly Setpoint[];
  curves: readonly Curve[];
  points: readonly Point[]; // in order of measurement
  log: readonly Line[]; // oldest first
  off: Off | null; // the newest outcome of making safe
}

export const noNight: Night = {
  seq: -1, run: 0, state: "", startedAt: "", endedAt: "", reason: "",
  setpoints: [], curves: [], points: [], log: [], off: null,
};

/** Applies entries in order. Those already seen change nothing. */
export function applyAll(night: Night, entries: readonly Entry[]): Night {
  return entries.reduce(apply, night);
}

export function apply(night: Night, e: Entry): Night {
  if (e.seq <= night.seq) return night;
  const same = e.run === night.run || e.run === 0;
  const base: Night = same ? night : { ...noNight, run: e.run };
  const n: Night = { ...base, seq: e.seq, log: [...base.log, line(e)].slice(-logKept) };
  if (e.state) n.state = e.state;
  switch (e.kind) {
    case "started":
      n.startedAt = base.startedAt || e.at;
      n.endedAt = "";
      if (e.setpoints?.length) n.setpoints = e.setpoints;
      if (e.curves?.length) n.curves = e.curves;
      break;
    case "point":
      if (e.point) n.points = withPoint(base.points, e.point);
      break;
    case "off":
      if (e.off) n.off = e.off;
      break;
    case "state":
      if (!ended(n.state)) n.endedAt = "";
      break;
    case "ended":
      n.endedAt = e.at;
      n.reason = e.words ?? "";
      break;
  }
  return n;
}

// A setpoint measured again replaces its point: every setpoint stands once.
function withPoint(points: readonly Point[], p: Point): Point[] {
  return [...points.filter((q) => q.setpoint.index !== p.setpoint.index), p];
}

function line(e: Entry): Line {
  return { seq: e.seq, at: e.at, kind: e.kind, words: e.words ?? "", point: e.point ?? null };
}

export function countFlagged(points: readonly Point[]): number {
  return points.filter(flagged).length;
}

/** The order quantities are shown in; unknown names come last, as they stand. */
const order: readonly Quantity[] = [
  "average_voltage", "duty", "frequency", "output_drop", "motor_current", "supply_current", "period", "t_high", "t_low",
  "high_level", "low_level", "ripple", "rise_time", "fall_time", "jitter", "overshoot", "output_current",
  "supply_voltage", "supply_power", "back_emf", "conduction", "speed", "control_voltage", "ambient",
];

/** The quantities worth a figure: those measured, before the first point those predicted. */
export function quantitiesOf(points: readonly Point[], curves: readonly Curve[], wanted: readonly Quantity[] = []): Quantity[] {
  const names = new Set<Quantity>(wanted);
  if (!wanted.length) for (const p of points) for (const r of p.readings) names.add(r.quantity);
  if (!names.size) for (const c of curves) for (const q of Object.keys(c.quantities)) names.add(q);
  names.delete("pot_resistance");
  const rank = (q: Quantity) => (order.indexOf(q) + 1) || order.length + 1;
  return [...names].sort((a, b) => rank(a) - rank(b));
}
