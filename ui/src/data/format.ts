// Numbers as the trade prints them: 4.352(12) V. The rules are those of
// instruments/si/print.go; change both together.

/** Stands between a number and its unit, so that they are never parted. */
export const nbsp = "\u00a0";
const minus = "\u2212";

const prefixes: readonly (readonly [string, number])[] = [
  ["G", 1e9], ["M", 1e6], ["k", 1e3], ["", 1], ["m", 1e-3], ["µ", 1e-6], ["n", 1e-9],
];
const unprefixed: ReadonlySet<string> = new Set(["1", "°C", "rad/s", "kg m2"]);

/** The engineering prefix for x and its factor. */
export function prefixFor(x: number, unit: string): readonly [string, number] {
  const a = Math.abs(x);
  if (unprefixed.has(unit) || a === 0) return ["", 1];
  return prefixes.find(([, f]) => a >= f * 0.9999995) ?? ["p", 1e-12];
}

/** A true minus sign. */
export function tidy(s: string): string {
  return s.replace("-", minus);
}

function suffix(prefix: string, unit: string): string {
  return unit === "1" || unit === "" ? "" : nbsp + prefix + unit;
}

/** Prints x with an engineering prefix and up to `figures` significant figures: "4.7 kΩ". */
export function format(x: number, unit: string, figures = 5): string {
  if (!Number.isFinite(x)) return "no value";
  const [p, f] = prefixFor(x, unit);
  return tidy(String(Number((x / f).toPrecision(figures)))) + suffix(p, unit);
}

/** Prints x with its standard uncertainty on the last digits, two figures of u (GUM 7.2.2). */
export function formatU(x: number, u: number | null | undefined, unit: string): string {
  if (!Number.isFinite(x)) return "no value";
  if (u === null || u === undefined || !(u > 0) || !Number.isFinite(u)) return format(x, unit);
  const [p, f] = prefixFor(Math.max(Math.abs(x), u), unit);
  const [xs, us] = [x / f, u / f];
  let dec = 1 - Math.floor(Math.log10(us));
  if (Math.round(us * 10 ** dec) >= 100) dec--;
  if (dec < 0) {
    const scale = 10 ** -dec;
    return tidy(`${Math.round(xs / scale) * scale}(${Math.round(us / scale) * scale})`) + suffix(p, unit);
  }
  return `${tidy(xs.toFixed(dec))}(${Math.round(us * 10 ** dec)})` + suffix(p, unit);
}

/** A setting in a sentence, three figures as the program's own words have it: "21.6 k", "5.5 k", "75 Ω". */
export function ohms(x: number): string {
  const s = format(x, "Ω", 3);
  return s.endsWith("kΩ") || s.endsWith("MΩ") ? s.slice(0, -1) : s;
}

/** Where the pot stands: its ohms, or with its wiper in the timing network the share of its track that charges, "35.2 %". */
export function potAt(s: { pot_resistance: number; pot_position?: number }): string {
  return s.pot_position ? `${Number((100 * s.pot_position).toPrecision(3))}${nbsp}%` : ohms(s.pot_resistance);
}

/** "9 V, 22 k" */
export function setting(s: { supply_voltage: number; pot_resistance: number; pot_position?: number }): string {
  return `${format(s.supply_voltage, "V", 3)}, ${potAt(s)}`;
}

/** Ties numbers to the units behind them in words that came from elsewhere. */
export function bound(words: string): string {
  return words.replace(/(\d\)?) (?=(?:[GMkmµn]?(?:V|A|Ω|s|Hz|W)|k|M|h|min|%|°C|×)(?![\p{L}\d]))/gu, `$1${nbsp}`);
}

const two = (n: number) => String(n).padStart(2, "0");

/** 24-hour clock: "22:24". */
export function clock(at: string | Date): string {
  const d = new Date(at);
  return `${two(d.getHours())}:${two(d.getMinutes())}`;
}

/** With seconds, for evidence and live readings: "01:58:07". */
export function clockSeconds(at: string | Date): string {
  return `${clock(at)}:${two(new Date(at).getSeconds())}`;
}

const months = ["January", "February", "March", "April", "May", "June", "July", "August", "September", "October", "November", "December"];
const days = ["Sun", "Mon", "Tue", "Wed", "Thu", "Fri", "Sat"];

/** "November 2026" */
export function month(at: string): string {
  const d = new Date(at);
  return `${months[d.getMonth()]} ${d.getFullYear()}`;
}

/** "Mon 30" */
export function day(at: string): string {
  const d = new Date(at);
  return `${days[d.getDay()]} ${d.getDate()}`;
}

/** "30 November 2026, 22:02" */
export function date(at: string): string {
  return `${new Date(at).getDate()} ${month(at)}, ${clock(at)}`;
}

/** A length of time, as roughly as it is known: "4 h 30 min", "12 min", "40 s". */
export function duration(seconds: number): string {
  const s = Math.max(0, seconds);
  if (s < 90) return `${s < 10 ? Math.ceil(s) : Math.ceil(s / 5) * 5}${nbsp}s`;
  let min = Math.round(s / 60);
  if (min < 60) return `${min}${nbsp}min`;
  if (min >= 120) min = Math.round(min / 10) * 10;
  const rest = min % 60;
  return `${Math.floor(min / 60)}${nbsp}h` + (rest ? ` ${rest}${nbsp}min` : "");
}

/** "1 point", "63 points" */
export function count(n: number, one: string, many = one + "s"): string {
  return `${n} ${n === 1 ? one : many}`;
}
