// What is said of a board: what it is, whether it oscillates, what is stressed most. Pure.
import type { Asked } from "./client";
import { bound, count, format, nbsp, ohms } from "./format";
import type { BoardDetail, BoardSetting, BoardStress, SchematicPart } from "./nouns";
import { listed } from "./words";

/** Above this share of a rating a plan is cautioned, above 1 refused; as sweeps/predict has it. */
export const cautionShare = 0.7;

const figures: Record<string, string> = { is: "saturation current", n: "emission coefficient", rs: "series resistance", shunt: "shunt resistance" };

/** A part's name with spaces: "charge diode, saturation current", "load, torque constant". */
export function partNamed(part: string): string {
  const [of, figure] = part.split(".");
  const name = (of ?? part).replaceAll("_", " ").replace(/^flyback$/, "flyback diode");
  return figure === undefined ? name : `${name}, ${figures[figure] ?? figure.replaceAll("_", " ")}`;
}

/** "Dosing pump driver B" */
export function boardNamed(b: { name: string; revision: string }): string {
  return [b.name, b.revision].filter(Boolean).join(" ");
}

/** Where the pot stands: "33 k", or "0.35 of the track". */
export function potAt(d: Pick<BoardDetail, "along">, pot: number): string {
  return d.along === "pot_position" ? `${Number(pot.toPrecision(3))} of the track` : ohms(pot);
}

/** "9 V, 33 k", with the temperature where it is not the usual. */
export function settingAt(d: Pick<BoardDetail, "along">, s: BoardSetting, temperature = false): string {
  const said = [format(s.supply_voltage, "V", 3)];
  if (s.pot !== undefined) said.push(potAt(d, s.pot));
  if (temperature) said.push(`${format(s.temperature, "°C", 3)}`);
  return said.join(", ");
}

function part(d: BoardDetail, name: string): SchematicPart | undefined {
  return d.schematic.parts.find((p) => p.name === name);
}

const stages: Record<string, string> = { npn: "an NPN transistor", darlington: "a Darlington", nmos: "a MOSFET" };

/** What the board is, in two sentences. */
export function whatItIs(d: BoardDetail): string {
  const [timer, switched, load] = [part(d, "timer"), part(d, "transistor"), part(d, "load")];
  const set = d.along === "supply_voltage" ? "no pot stands in its timing" : d.along === "pot_position" ? "a pot’s wiper sets its timing" : "the bench’s pot stands in its timing";
  const through = switched ? ` through ${stages[switched.kind] ?? switched.kind}` : " from its own output";
  const drives = load ? ` drives a ${load.kind === "motor" ? `motor of ${load.value}` : `resistor of ${load.value}`}${through}` : "";
  const [low, high] = d.rated_supply;
  return bound(`A ${timer?.value ?? ""} timer in the ${d.network} network${drives}; ${set}. Rated for ${format(low!, "V", 3)} to ${format(high!, "V", 3)}.`);
}

/** Over which settings the curves go: "7 to 12 V and 1 k to 82 k". */
export function rangeOf(d: BoardDetail): string {
  const supplies = d.curves.flatMap((c) => (c.supply_voltage === undefined ? c.at : [c.supply_voltage]));
  const volts = `${format(Math.min(...supplies), "V", 3).replace(`${nbsp}V`, "")} to ${format(Math.max(...supplies), "V", 3)}`;
  const at = d.curves[0]?.at ?? [];
  return d.along === "supply_voltage" || at.length < 2 ? volts : `${volts} and ${potAt(d, at[0]!)} to ${potAt(d, at[at.length - 1]!)}`;
}

/** Whether it oscillates over the range, and where not. */
export function oscillation(d: BoardDetail): string {
  const o = d.oscillation;
  const words = o.words ? `: ${o.words.replace(/\.$/, "")}` : "";
  const first = o.at ? `, first at ${settingAt(d, o.at)}${words}` : "";
  if (o.never) return bound(`It does not oscillate at ${o.never} of the ${count(o.settings, "setting")} looked at${first}.`);
  if (o.doubtful) return bound(`With nominal parts it oscillates everywhere from ${rangeOf(d)}; at ${count(o.doubtful, "setting")} not every board within tolerance does${first}.`);
  return bound(`It oscillates at all ${count(o.settings, "setting")} looked at, from ${rangeOf(d)}, with every one of ${d.draws} boards drawn within tolerance.`);
}

/** The view's largest words. */
export function boardHeadline(d: BoardDetail): string {
  const name = boardNamed(d.board);
  const o = d.oscillation;
  const share = d.hardest ? most(d.hardest.stress) : 0;
  if (o.settings > 0 && o.never === o.settings) return `${name} does not oscillate`;
  const swings = o.never ? `${name} does not oscillate everywhere` : o.doubtful ? `${name} may not oscillate everywhere` : `${name} oscillates at every setting`;
  if (share > 1) return `${swings}, and is overloaded at some`;
  return share > cautionShare ? `${swings}, close to a rating at some` : share > 0 ? `${swings}, and every known rating is kept` : swings;
}

/** The larger share of the rating, running or held; 0 where no rating is known. */
export function most(s: BoardStress): number {
  return Math.max(s.running_share ?? 0, s.held_share ?? 0);
}

export function percent(share: number): string {
  const p = 100 * share;
  if (p === 0) return `0${nbsp}%`;
  return `${p < 0.95 ? "below 1" : p.toFixed(0)}${nbsp}%`;
}

/** "Stressed most: the timer’s supply voltage, 67 % of its 18 V, at 12 V, 1 k." */
export function stressedMost(d: BoardDetail): string {
  const h = d.hardest;
  if (!h || h.stress.rating === undefined) return "No rating of its parts is known.";
  const held = h.held ? " with the rotor held" : "";
  return bound(`Stressed most: the ${partNamed(h.stress.part)}’s ${h.stress.what}, ${percent(most(h.stress))} of ${format(h.stress.rating, h.stress.unit, 3)}${held}, at ${settingAt(d, h.setting)}.`);
}

/** Stresses, the nearest to its rating first; without a rating last. */
export function byShare(all: readonly BoardStress[]): BoardStress[] {
  const rank = (s: BoardStress) => (s.rating === undefined ? -1 : most(s));
  return [...all].sort((a, b) => rank(b) - rank(a));
}

export interface Bar { part: string; value: number }

/** Below this, in percent a percent, a part has no bar of its own. */
export const least = 5e-4;

/** What one percent of each part makes of a quantity, the greatest first; how many make next to nothing. */
export function bars(d: Pick<BoardDetail, "sensitivities">, quantity: string): { bars: Bar[]; rest: number } {
  const all = d.sensitivities.flatMap((s): Bar[] => (s.values[quantity] === undefined ? [] : [{ part: s.part, value: s.values[quantity]! }]));
  const shown = all.filter((b) => Math.abs(b.value) >= least).sort((a, b) => Math.abs(b.value) - Math.abs(a.value));
  return { bars: shown, rest: all.length - shown.length };
}

/** Where the motor starts and stalls along the pot; empty where there is none, or nothing was found out. */
export function motorWords(d: BoardDetail): string {
  if (!d.motor) return "";
  const volts = format(d.setting.supply_voltage, "V", 3);
  const marks: string[] = [];
  if (d.starts !== undefined) marks.push(`just starts from rest at ${potAt(d, d.starts)}`);
  if (d.stalls !== undefined) marks.push(`just goes on running at ${potAt(d, d.stalls)}`);
  if (marks.length) return bound(`At ${volts} the motor ${listed(marks)} of the pot: ${d.motor}.`);
  const flags = new Set(d.flags.map((f) => f.name));
  if (flags.has("stalled")) return `At ${volts} the motor stands at every setting of the pot.`;
  if (flags.has("no_start")) return `At ${volts} the motor goes on running at every setting of the pot, but starts from rest at none.`;
  return `At ${volts} the motor starts from rest at every setting of the pot.`;
}

/** What was typed, read: plain numbers and engineering prefixes, with or without the unit. Undefined: nothing. NaN: not understood. */
export function typed(text: string): number | undefined {
  if (!text) return undefined;
  const m = /^([-+]?\d+(?:[.,]\d+)?)\s*(m|k|M)?\s*(?:V|Ω|ohms?|°?C|degC)?$/.exec(text.replace("−", "-"));
  if (!m) return NaN;
  return Number(m[1]!.replace(",", ".")) * ({ m: 1e-3, k: 1e3, M: 1e6 }[m[2] ?? ""] ?? 1);
}

/** What is asked of the daemon, and what in it was not understood. */
export function asked(at: { supply: string; pot: string; temperature: string }): { asked: Asked; wrong: string } {
  const read = { supply: typed(at.supply), pot: typed(at.pot), temperature: typed(at.temperature) };
  const wrong = Object.entries(read).filter(([, v]) => Number.isNaN(v)).map(([k]) => k);
  if (wrong.length) return { asked: {}, wrong: `The ${listed(wrong)} can’t be read: write it like 9, 33k or 27.` };
  return { asked: read, wrong: "" };
}
