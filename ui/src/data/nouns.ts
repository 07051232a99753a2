// The nouns of the work, as the wire has them: short names for the generated types of api.ts.
import type { components } from "./api";

type Schemas = components["schemas"];

export type Answering = Schemas["Answering"];
export type Bench = Schemas["Bench"];
export type Board = Schemas["Board"];
export type BoardDetail = Schemas["BoardDetail"];
export type BoardSetting = Schemas["BoardSetting"];
export type BoardStress = Schemas["BoardStress"];
export type Curve = Schemas["Curve"];
export type Entry = Schemas["Entry"];
export type Flag = Schemas["Flag"];
export type Instrument = Schemas["Instrument"];
export type Off = Schemas["Off"];
export type Point = Schemas["Point"];
export type Reading = Schemas["Reading"];
export type Run = Schemas["Run"];
export type RunDetail = Schemas["RunDetail"];
export type Schematic = Schemas["Schematic"];
export type SchematicPart = Schemas["SchematicPart"];
export type Setpoint = Schemas["Setpoint"];
export type Status = Schemas["Status"];
export type StreamMessage = Schemas["StreamMessage"];
export type Vitals = Schemas["Vitals"];
export type Waveforms = Schemas["Waveforms"];
/** One raw waveform: volts = code × volts_per_code + volts_at_zero. */
export type Wave = Schemas["Record"];

export type Kind = Entry["kind"];
export type State = Run["state"];
/** A quantity's name. Predictions and the address bring any string, so it is one here. */
export type Quantity = string;

/** Without raw replies and without predictions of what was not measured: a page left open all night keeps only what it draws. */
export function lean(p: Point): Point {
  const predictions: Point["predictions"] = {};
  for (const { quantity } of p.readings) if (p.predictions[quantity]) predictions[quantity] = p.predictions[quantity];
  return { ...p, predictions, readings: p.readings.map((r) => ({ ...r, raw: undefined })) };
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
