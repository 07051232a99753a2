// What a figure draws, taken out of points and curves: one series a supply. Pure.
import { type Curve, flagged, type Point, type Quantity, reading, type Setpoint } from "../data/nouns";

/** The 95 % interval is this many standard deviations to either side. */
const k95 = 1.96;

export interface Dot {
  index: number;
  x: number; // Ω
  y: number; // SI
  u: number;
  hollow: boolean;
  flags: string[]; // names
  direction: string;
  recheck: boolean;
  residual: number | null; // measured less predicted, in joint standard uncertainties
}

/** One way of travel along the axis, once. */
export interface Pass { pass: number; direction: string; runs: Dot[][] } // runs: unbroken stretches

export interface Series {
  supply: number; // V
  x: number[];
  value: (number | null)[];
  low: (number | null)[];
  high: (number | null)[];
  dots: Dot[];
  passes: Pass[];
}

export interface FigureData { quantity: Quantity; unit: string; series: Series[] }

export function figureData(q: Quantity, points: readonly Point[], curves: readonly Curve[], setpoints: readonly Setpoint[]): FigureData {
  const supplies = [...new Set([...curves.map((c) => c.supply_voltage), ...setpoints.map((s) => s.supply_voltage), ...points.map((p) => p.setpoint.supply_voltage)])].sort((a, b) => a - b);
  let unit = "";
  const series = supplies.map((supply): Series => {
    const curve = curves.find((c) => c.supply_voltage === supply);
    const line = curve?.quantities[q];
    unit ||= line?.unit ?? "";
    const here = points.filter((p) => p.setpoint.supply_voltage === supply);
    const dots = here.map((p) => dot(q, p)).filter((d) => d !== null);
    unit ||= here.map((p) => reading(p, q)?.unit ?? "").find(Boolean) ?? "";
    const order = setpoints.filter((s) => s.supply_voltage === supply);
    return {
      supply, x: line ? curve!.pot_resistance : [], value: line?.value ?? [], low: line?.low ?? [], high: line?.high ?? [],
      dots, passes: passes(order.length ? order : here.map((p) => p.setpoint), dots),
    };
  });
  return { quantity: q, unit, series: series.filter((s) => s.dots.length || s.value.some((v) => v !== null)) };
}

function dot(q: Quantity, p: Point): Dot | null {
  const r = reading(p, q);
  if (!r || r.value === null) return null;
  const u = r.u ?? 0;
  const pred = p.predictions[q];
  const joint = pred ? Math.hypot(u, (pred.high - pred.low) / (2 * k95)) : 0;
  const flags = [...r.flags, ...p.flags].map((f) => f.name);
  return {
    index: p.setpoint.index, x: p.setpoint.pot_resistance, y: r.value, u,
    hollow: flags.length > 0, flags, direction: p.setpoint.direction, recheck: p.setpoint.recheck ?? false,
    residual: pred && joint > 0 ? (r.value - pred.value) / joint : null,
  };
}

// Dots are joined in the order of the plan; a setpoint without a value is a gap, never bridged. Rechecks stand alone.
function passes(order: readonly Setpoint[], dots: readonly Dot[]): Pass[] {
  const byIndex = new Map(dots.map((d) => [d.index, d]));
  const out: Pass[] = [];
  for (const s of order) {
    if (s.recheck) continue;
    let p = out[out.length - 1];
    if (!p || p.pass !== s.pass) out.push((p = { pass: s.pass, direction: s.direction, runs: [[]] }));
    const d = byIndex.get(s.index);
    if (d) p.runs[p.runs.length - 1]!.push(d);
    else p.runs.push([]);
  }
  for (const p of out) p.runs = p.runs.filter((r) => r.length > 0);
  return out.filter((p) => p.runs.length > 0);
}

/** Least and greatest of everything drawn, from zero where a scale from zero is the honest one. */
export function extent(d: FigureData): [number, number] {
  let [lo, hi] = [Infinity, -Infinity];
  const see = (y: number | null) => {
    if (y === null) return;
    lo = Math.min(lo, y);
    hi = Math.max(hi, y);
  };
  for (const s of d.series) {
    [...s.value, ...s.low, ...s.high].forEach(see);
    for (const t of s.dots) see(t.y);
  }
  if (lo > hi) return [0, 1];
  if (d.unit !== "°C") lo = Math.min(lo, 0);
  if (d.quantity === "duty") hi = Math.max(hi, 1);
  return lo === hi ? [lo, lo + 1] : [lo, hi];
}

/** Least and greatest resistance on the figure, Ω. */
export function reach(d: FigureData, setpoints: readonly Setpoint[]): [number, number] {
  const xs = [...d.series.flatMap((s) => [...s.x, ...s.dots.map((t) => t.x)]), ...setpoints.map((s) => s.pot_resistance)].filter((x) => x > 0);
  if (!xs.length) return [1e3, 1e5];
  const [lo, hi] = [Math.min(...xs), Math.max(...xs)];
  return lo === hi ? [lo / 2, hi * 2] : [lo, hi];
}

/** Points of a series that carry a flag somewhere, as in the tally. */
export function hollowIndices(points: readonly Point[]): Set<number> {
  return new Set(points.filter(flagged).map((p) => p.setpoint.index));
}
