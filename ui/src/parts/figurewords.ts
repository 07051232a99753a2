// What a figure says of itself, for those who read it and those who hear it.
import { count, format, nbsp, ohms } from "../data/format";
import { flagged, type Point } from "../data/nouns";
import { listed, sentenceCase, titled } from "../data/words";
import { residual } from "./axes";
import type { FigureData } from "./series";

/** "Average voltage … against pot resistance at 5, 9 and 12 V. 63 points, 4 flagged. Nothing measured yet at 12 V." */
export function description(d: FigureData, points: readonly Point[]): string {
  const volts = listed(d.series.map((s) => format(s.supply, "V", 3)));
  const n = d.series.reduce((a, s) => a + s.dots.length, 0);
  const flags = points.filter(flagged).length;
  const coming = d.series.filter((s) => !s.dots.length).map((s) => format(s.supply, "V", 3));
  return [
    `${sentenceCase(titled(d.quantity))} against pot resistance at ${volts}, measured and predicted.`,
    `${count(n, "point")} measured${flags ? `, ${flags} flagged` : ""}.`,
    coming.length ? `Nothing measured yet at ${listed(coming)}.` : "",
  ].filter(Boolean).join(" ");
}

const key = `Ink is measured, with bars of two standard uncertainties; pencil is predicted from the schematic, its band holds 95${nbsp}%.`;

/** What the marks mean, and where the board departs most. */
export function caption(d: FigureData): string {
  const dots = d.series.flatMap((s) => s.dots.map((t) => ({ ...t, supply: s.supply })));
  const hollow = dots.some((t) => t.hollow) ? " A hollow dot carries a flag." : "";
  const away = dots.filter((t) => t.residual !== null && Math.abs(t.residual) > 2).sort((a, b) => Math.abs(b.residual!) - Math.abs(a.residual!));
  const worst = away[0];
  if (!worst) return key + hollow;
  const where = `${format(worst.supply, "V", 3)}, ${ohms(worst.x)}`;
  const many = away.length === 1 ? "One point is" : `${away.length} points are`;
  return `${key}${hollow} ${many} more than 2${nbsp}u from the prediction${away.length > 1 ? ", most" : ","} at ${where}: ${residual(worst.residual!)}${nbsp}u.`;
}
