// Sentences. Present for now, past for what happened; no exclamations.
import { bound, clock, clockSeconds, count, duration, format, formatU, nbsp, potAt, setting } from "./format";
import { ended, flagged, type Flag, type Off, type Point, type Quantity, reading, type Run, type Status, type Vitals } from "./nouns";

const titles: Record<Quantity, string> = {
  average_voltage: "average voltage across the load",
  duty: "duty cycle",
  output_drop: "output drop, supply less high level",
};

/** A quantity's name with spaces, for sentences and pickers. */
export function named(q: Quantity): string {
  return q.replaceAll("_", " ");
}

/** A quantity's title over a figure, without its unit. */
export function titled(q: Quantity): string {
  return titles[q] ?? named(q);
}

export function sentenceCase(s: string): string {
  return s.charAt(0).toUpperCase() + s.slice(1);
}

/** Words from elsewhere as a whole sentence: a capital, a full stop, units tied to their numbers. */
export function sentence(s: string): string {
  return bound(sentenceCase(s.replace(/\.?$/, s ? "." : "")));
}

/** The bench in a sentence: "Bench 2", "the practice bench". */
export function benchNamed(name: string): string {
  return !name || /^practice bench$/i.test(name) ? `the ${name.toLowerCase() || "bench"}` : name;
}

/** "supply, meter and cutoff" */
export function listed(names: readonly string[]): string {
  return names.length < 2 ? (names[0] ?? "") : `${names.slice(0, -1).join(", ")} and ${names[names.length - 1]}`;
}

/** The sentence that stands first on every view: its first word, its evidence, the live reading. */
export interface Standing { word: string; caution: boolean; evidence: string; live: string; brief: string }

export type Link =
  | { state: "connecting" }
  | { state: "live" }
  | { state: "lost"; since: string };

export function standing(v: Vitals | null, link: Link): Standing {
  if (link.state === "lost") return notLive(v, link.since);
  if (!v) return { word: "Not known yet.", caution: false, evidence: "Waiting for the bench’s first answer.", live: "", brief: "Waiting for the bench" };
  if (v.energised === "unconfirmed") {
    const evidence = v.read_at ? `The output may be on; the supply was last read at ${clockSeconds(v.read_at)}.` : "The output may be on; the supply has not answered.";
    return { word: "Unconfirmed.", caution: true, evidence, live: "", brief: "Unconfirmed: take the board as live" };
  }
  return v.energised === "yes" ? energised(v) : notEnergised(v);
}

function energised(v: Vitals): Standing {
  const evidence = v.since ? `Output on since ${clock(v.since)}` : "Output on";
  const reads = readsNow(v);
  return {
    word: "Energised.", caution: false,
    evidence: reads ? evidence : evidence + ".",
    live: reads,
    brief: v.supply_voltage ? `Energised, ${v.supply_voltage.toFixed(2)}${nbsp}V` : "Energised",
  };
}

/** "supply reads 9.003(4) V, 52(1) mA at 01:58:07": empty when nothing was read. */
export function readsNow(v: Vitals): string {
  const parts: string[] = [];
  if (v.supply_voltage !== undefined) parts.push(formatU(v.supply_voltage, v.supply_voltage_u, "V"));
  if (v.supply_current !== undefined) parts.push(formatU(v.supply_current, v.supply_current_u, "A"));
  return parts.length ? parts.join(", ") : "";
}

function notEnergised(v: Vitals): Standing {
  const by = v.confirmed_by?.length ? `, confirmed by ${listed(v.confirmed_by)}` : "";
  const evidence = v.since ? `Output off since ${clockSeconds(v.since)}${by}.` : `Output off${by}.`;
  return { word: "Not energised.", caution: false, evidence, live: "", brief: v.since ? `Not energised, off since ${clockSeconds(v.since)}` : "Not energised" };
}

function notLive(v: Vitals | null, since: string): Standing {
  const heard = !v ? "Nothing was heard from the bench yet."
    : v.energised === "yes" ? `When last heard: energised, output on${v.supply_voltage ? `, ${format(v.supply_voltage, "V", 3)}` : ""}.`
    : v.energised === "no" ? "When last heard: not energised."
    : "When last heard: off was not confirmed.";
  return {
    word: `Not live since ${clockSeconds(since)}.`, caution: true,
    evidence: `${heard} This page tries again every 5${nbsp}s.`, live: "",
    brief: `Not live since ${clock(since)}`,
  };
}

/** The second sentence: run, points, time left. */
export function progress(v: Vitals | null, link: Link, bench: string): string {
  if (link.state === "lost") {
    const safe = v && v.run && v.safe_by ? `The bench goes on by itself and is safe by ${clock(v.safe_by)} whatever remains. ` : "The bench goes on by itself. ";
    return `${safe}“Outputs off” may not get through: to be sure, use the switch at the bench.`;
  }
  if (!v) return "";
  if (!v.run || ended(v.state)) return `Nothing is running on ${benchNamed(bench)}.`;
  const flags = v.flagged ? `, ${v.flagged} flagged` : "";
  return [`Run ${v.run}: ${v.measured} of ${count(v.planned, "point")}${flags}.`, timeLeft(v)].filter(Boolean).join(" ");
}

/** "About 4 h 30 min left, done near 06:30; safe by 07:02 whatever remains." */
export function timeLeft(v: Vitals): string {
  const safe = v.safe_by ? `safe by ${clock(v.safe_by)} whatever remains.` : "";
  if (v.state === "making_safe") return "Making safe.";
  if (v.state === "held") return "Held: the output is off until the run is continued.";
  if (v.state === "asking") return "It waits for a person.";
  if (v.time_left === undefined) return sentenceCase(safe);
  const near = new Date(new Date(v.at).getTime() + v.time_left * 1000);
  const done = v.time_left < 90 ? "" : `, done near ${clock(near)}`;
  return `About ${duration(v.time_left)} left${done}${safe ? "; " + safe : "."}`;
}

/** Short, for the bar at the foot of a phone. */
export function briefProgress(v: Vitals | null): string {
  if (!v || !v.run || ended(v.state)) return "";
  const left = v.time_left === undefined ? "" : `, ${duration(v.time_left)} left`;
  return `${v.measured} of ${v.planned}${left}`;
}

/** "Practice bench at 20 × speed"; empty for a real bench. */
export function pace(s: Status | null): string {
  if (!s) return "";
  const times = s.pace !== 1 && s.pace > 0 ? ` at ${s.pace}${nbsp}×${nbsp}speed` : "";
  if (s.practice) return `Practice bench${times}`;
  return times ? `Running${times}` : "";
}

/** The flags of a point, each said once; `on` names the quantities it stands on, none where it stands on all. */
export function flagsOf(p: Point): (Flag & { on: string[] })[] {
  const found = new Map<string, Flag & { on: string[] }>();
  for (const f of p.flags) found.set(f.name + f.words, { ...f, on: [] });
  for (const r of p.readings)
    for (const f of r.flags) {
      const g = found.get(f.name + f.words) ?? { ...f, on: [] };
      g.on.push(named(r.quantity));
      found.set(f.name + f.words, g);
    }
  return [...found.values()].map((g) => (g.on.length === p.readings.length ? { ...g, on: [] } : g));
}

/** What the run does this minute, with the repeats done where they are counted. */
export function doingNow(v: Vitals): string {
  const repeats = v.repeat > 0 && v.repeats > 1 && !v.doing.includes("repeat") ? `; ${v.repeat} of ${v.repeats} repeats` : "";
  return bound((v.doing || sentenceCase(named(v.state ?? "preparing"))) + repeats);
}

/** "9 V, 18 k: 6.21(6) V, duty 0.353(2). Good."; the supply is left out where the line before has it. A flagged point ends "flagged ". */
export function pointWords(p: Point, sameSupply = false): string {
  const said: string[] = [];
  for (const q of ["average_voltage", "duty"]) {
    const r = reading(p, q);
    if (!r || r.value === null) continue;
    said.push((q === "average_voltage" ? "" : named(q) + " ") + formatU(r.value, r.u, r.unit));
  }
  return `${p.setpoint.recheck ? "Recheck at " : ""}${sameSupply ? potAt(p.setpoint) : setting(p.setpoint)}${said.length ? ": " + said.join(", ") : ""}${flagged(p) ? ", flagged " : ". Good."}`;
}

/** An instrument's own name: a meter's role goes without saying beside the others. */
export function shortly(name: string): string {
  return name.replace(/^meter /, "");
}

/** The headline when no run is open. */
export function headline(run: Run | null): string {
  if (!run) return "Nothing has been measured here yet";
  const verb: Record<string, string> = { done: "is done", stopped: "was stopped", tripped: "tripped", failed: "failed", interrupted: "was interrupted" };
  return `Run ${run.id} ${verb[run.state] ?? "is " + named(run.state)}`;
}

/** "48 points, 3 flagged." */
export function tallied(r: { measured: number; planned: number; flagged: number }): string {
  const of = r.measured === r.planned ? count(r.measured, "point") : `${r.measured} of ${count(r.planned, "point")}`;
  return `${of}${r.flagged ? `, ${r.flagged} flagged` : ""}.`;
}

/** What pressing "Outputs off" brought. */
export function offOutcome(off: Off): string {
  if (!off.confirmed) return `Off was sent and is not confirmed. ${off.words}`.trim();
  const volts = off.voltage === null ? "" : `: ${format(off.voltage, "V", 3)}, below ${format(off.below, "V", 3)}`;
  return `Off confirmed at ${clockSeconds(off.at)}${off.by.length ? ` by ${listed(off.by)}` : ""}${volts}.`;
}
