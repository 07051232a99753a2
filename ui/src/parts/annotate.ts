// The words and small marks on a figure: which curve, which way, what is flagged,
// where the run is now. Placed where they cover least. Pure.
import { format, potAt, setting } from "../data/format";
import type { Now } from "./figure";
import type { Frame } from "./frame";
import { type Box, labelWidth, Room, some, spread } from "./place";
import { interpolate } from "./scale";
import type { Dot, FigureData, Pass, Series } from "./series";

export interface Label { text: string; x: number; y: number; anchor: "start" | "middle" | "end"; mark: string }
export interface Stroke { d: string; mark: string }
export interface Annotations { labels: Label[]; lines: Stroke[] }

const lineHeight = 15;
/** Dots beside which a label is tried. */
const tries = 12;

export function annotate(f: Frame, data: FigureData, now: Now | null): Annotations {
  const out: Annotations = { labels: [], lines: [] };
  const room = new Room({ x: f.left, y: f.top - 4, w: f.right - f.left, h: f.bottom - f.top + 4 });
  for (const s of data.series) {
    room.markLine(s.x.flatMap((x, i) => (s.value[i] === null || s.value[i] === undefined ? [] : [[f.px(x), f.py(s.value[i]!)] as const])));
    for (const d of s.dots) for (const e of [-4, 0, 4]) room.mark(f.px(d.x) + e, f.py(d.y) + e);
  }
  ends(f, data, out);
  if (now) nowBracket(f, data, now, room, out);
  for (const s of data.series) {
    if (s.dots.length) for (const p of ways(s.passes)) arrow(f, data, s, p, room, out);
    else if (now?.setpoint.supply_voltage !== s.supply) notBegun(f, s, room, out);
  }
  for (const s of data.series) flags(f, s, room, out);
  return out;
}

/** The supply's name at the end of its curve. */
function ends(f: Frame, data: FigureData, out: Annotations) {
  const at = data.series.map((s) => f.py(lastY(s)) + 4);
  spread(at, lineHeight).forEach((y, i) => out.labels.push({ text: format(data.series[i]!.supply, "V", 3), x: f.right + 7, y, anchor: "start", mark: "lab strong" }));
}

function lastY(s: Series): number {
  for (let i = s.value.length - 1; i >= 0; i--) if (s.value[i] !== null && s.value[i] !== undefined) return s.value[i]!;
  return s.dots.reduce((a, b) => (b.x > a.x ? b : a)).y;
}

/** The curve's height in px at px x: the prediction's, else the nearest dot's. */
function heightAt(f: Frame, s: Series, ohmsAt: number): number | null {
  const y = interpolate(s.x, s.value, ohmsAt);
  if (y !== null) return f.py(y);
  const near = s.dots.reduce<Dot | null>((a, b) => (!a || Math.abs(Math.log(b.x / ohmsAt)) < Math.abs(Math.log(a.x / ohmsAt)) ? b : a), null);
  return near && f.py(near.y);
}

/** The newest pass of each direction: where a curve is gone over often, its first passes need no more words. */
function ways(passes: readonly Pass[]): Pass[] {
  return ["up", "down"].flatMap((way) => passes.filter((p) => p.direction === way).slice(-1));
}

/** An arrow along the curve, with its word, once a direction: up above it, down below. */
function arrow(f: Frame, data: FigureData, s: Series, p: Pass, room: Room, out: Annotations) {
  const run = p.runs.reduce((a, b) => (b.length > a.length ? b : a));
  if (run.length < 3 || (p.direction !== "up" && p.direction !== "down")) return;
  const side = p.direction === "up" ? -1 : 1;
  const inner = [...run].sort((a, b) => a.x - b.x).slice(1, -1);
  const boxes = some(inner, tries).flatMap((d) => {
    const slope = slopeAt(run, inner, inner.indexOf(d), f);
    return [15, 22].map((away) => ({ ...arrowBox(f.px(d.x), f.py(d.y) + side * away, slope, side), ohms: d.x }));
  });
  const b = room.place(boxes, 8);
  if (!b) return;
  const to = p.direction === "up" ? 1 : -1;
  const [x0, y0, x1, y1] = [b.cx - to * 14, b.cy - to * 14 * b.slope, b.cx + to * 14, b.cy + to * 14 * b.slope];
  out.lines.push({ d: `M${fix(x0)} ${fix(y0)}L${fix(x1)} ${fix(y1)}` + head(x0, y0, x1, y1), mark: "arw" });
  const text = crowded(f, data, s, b.ohms) ? `${p.direction}, ${format(s.supply, "V", 3)}` : p.direction;
  out.labels.push({ text, x: b.cx, y: fix(b.cy + (side < 0 ? -8 : 18)), anchor: "middle", mark: "lab" });
}

/** Whether another curve runs so near that the arrow must say whose it is. */
function crowded(f: Frame, data: FigureData, s: Series, ohmsAt: number): boolean {
  const y = heightAt(f, s, ohmsAt);
  return data.series.some((t) => {
    const other = t === s ? null : heightAt(f, t, ohmsAt);
    return y !== null && other !== null && Math.abs(other - y) < 30;
  });
}

interface ArrowBox extends Box { cx: number; cy: number; slope: number }

function arrowBox(cx: number, cy: number, slope: number, side: number): ArrowBox {
  const h = Math.abs(slope) * 14;
  const top = side < 0 ? cy - h - 18 : cy - h - 3;
  return { x: cx - 17, y: top, w: 34, h: 2 * h + 21, cx, cy, slope };
}

function slopeAt(run: readonly Dot[], inner: readonly Dot[], i: number, f: Frame): number {
  const [a, b] = [inner[i - 1] ?? inner[i]!, inner[i + 1] ?? inner[i]!];
  const [l, r] = a === b ? [run[0]!, run[run.length - 1]!] : [a, b];
  const dx = f.px(r.x) - f.px(l.x);
  return dx === 0 ? 0 : Math.max(-1.2, Math.min(1.2, (f.py(r.y) - f.py(l.y)) / dx));
}

/** Two short strokes back from the arrow's point. */
function head(x0: number, y0: number, x1: number, y1: number): string {
  const a = Math.atan2(y1 - y0, x1 - x0);
  return [2.7, -2.7].map((t) => `M${fix(x1)} ${fix(y1)}L${fix(x1 + 7 * Math.cos(a + t))} ${fix(y1 + 7 * Math.sin(a + t))}`).join("");
}

function notBegun(f: Frame, s: Series, room: Room, out: Annotations) {
  const volts = format(s.supply, "V", 3);
  const text = f.narrow ? `${volts}: not begun` : `${volts} not begun: prediction only`;
  const w = labelWidth(text);
  const [x0, x1] = [s.x[0] ?? 0, s.x[s.x.length - 1] ?? 0];
  const boxes = [0.2, 0.3, 0.1, 0.4, 0.5, 0.05].flatMap((t) => {
    const x = x0 * (x1 / x0) ** t;
    const y = heightAt(f, s, x);
    return y === null ? [] : [16, 24, 34, 46, -30, -42, -54].map((dy) => ({ x: f.px(x), y: y + dy, w, h: lineHeight }));
  });
  const b = room.place(boxes, 1);
  if (b) out.labels.push({ text, x: fix(b.x), y: fix(b.y + 12), anchor: "start", mark: "lab" });
}

/** Flagged dots of one name on one curve: the name, how many, and a thin line to one of them. */
function flags(f: Frame, s: Series, room: Room, out: Annotations) {
  const groups = new Map<string, Dot[]>();
  for (const d of s.dots) for (const name of new Set(d.flags)) groups.set(name, [...(groups.get(name) ?? []), d]);
  for (const [name, dots] of [...groups].slice(0, 3)) {
    const text = `${dots.length > 1 ? `${dots.length} ` : ""}${name}, ${format(s.supply, "V", 3)}`;
    const w = labelWidth(text);
    const boxes = some(dots, tries).flatMap((d) => [[-w - 22, 22], [14, -36], [-w - 14, -38], [14, 24], [-w / 2, 34], [-w / 2, -48]].map(([dx, dy]) => ({ x: f.px(d.x) + dx!, y: f.py(d.y) + dy!, w, h: lineHeight, d })));
    const b = room.place(boxes, 3);
    if (!b) continue;
    const [dx, dy] = [f.px(b.d.x), f.py(b.d.y)];
    const from = dx > b.x + w ? b.x + w + 2 : dx < b.x ? b.x - 2 : b.x + w / 2;
    out.lines.push({ d: `M${fix(from)} ${fix(dy > b.y + 8 ? b.y + 13 : b.y + 3)}L${fix(dx)} ${fix(dy + (dy > b.y ? -4 : 4))}`, mark: "lead" });
    out.labels.push({ text, x: fix(b.x), y: fix(b.y + 12), anchor: "start", mark: "lab" });
  }
}

/** The pair of brackets where the run is, a stroke in it for each repeat done. */
function nowBracket(f: Frame, data: FigureData, now: Now, room: Room, out: Annotations) {
  const s = data.series.find((t) => t.supply === now.setpoint.supply_voltage);
  const y = s && heightAt(f, s, now.setpoint.pot_resistance);
  if (!s || y === null || y === undefined) return;
  const x = f.px(now.setpoint.pot_resistance);
  const [w, h] = [9, 8];
  out.lines.push(
    { d: `M${x} ${y + h + 2}V${f.axis}`, mark: "nowl" },
    { d: `M${x - w + 4} ${y - h}h-4v${2 * h}h4M${x + w - 4} ${y - h}h4v${2 * h}h-4`, mark: "nowb" },
    { d: strokes(x, y, Math.min(now.repeat, 12), now.repeats), mark: "tick" },
  );
  room.take({ x: x - w - 2, y: y - h - 2, w: 2 * w + 4, h: 2 * h + 4 });
  const where = f.narrow ? `${now.word}: ${potAt(now.setpoint)}` : `${now.word}: ${setting(now.setpoint)}`;
  const done = now.repeat > 0 && now.repeats > 0 ? `${now.repeat} of ${now.repeats}${f.narrow ? "" : " repeats"}` : "";
  const wide = Math.max(labelWidth(where) * 1.1, labelWidth(done));
  const boxes = [[-wide - 10, 18], [10, -46], [-wide - 10, 40], [12, 14], [-wide - 12, -50], [10, -64], [-wide - 10, 70]].map(([dx, dy]) => ({ x: x + dx!, y: y + dy!, w: wide, h: 2 * lineHeight + 2, right: dx! < 0 }));
  const b = room.place(boxes);
  if (!b) return;
  const [tx, anchor] = b.right ? [b.x + b.w, "end" as const] : [b.x, "start" as const];
  out.labels.push({ text: where, x: fix(tx), y: fix(b.y + 12), anchor, mark: "lab strong" });
  if (done) out.labels.push({ text: done, x: fix(tx), y: fix(b.y + 28), anchor, mark: f.narrow ? "lab strong" : "lab" });
}

function strokes(x: number, y: number, n: number, of: number): string {
  const step = Math.min(2.4, 11 / Math.max(of, 1));
  return Array.from({ length: n }, (_, i) => `M${fix(x + (i - (n - 1) / 2) * step)} ${y - 3.5}v7`).join("");
}

function fix(x: number): number {
  return Math.round(x * 10) / 10;
}
