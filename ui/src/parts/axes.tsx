// Log paper, the scales' figures, and the strip of residuals.
import { format, tidy } from "../data/format";
import { type Along, type Frame, stripReach } from "./frame";
import type { FigureData } from "./series";

const names: Record<Along, string> = { pot_resistance: "pot resistance, Ω", pot_position: "pot position, share of the track that charges", supply_voltage: "supply voltage, V" };

export function Axes({ f, title }: { f: Frame; title: string }) {
  const [fine, firm] = [f.xTicks.filter((t) => !t.decade), f.xTicks.filter((t) => t.decade)];
  return (
    <g>
      <path class="grid" d={f.yTicks.map((y) => `M${f.left} ${f.py(y)}H${f.right}`).join("") + fine.map((t) => `M${f.px(t.at)} ${f.top}V${f.axis}`).join("")} />
      <path class="gridd" d={firm.map((t) => `M${f.px(t.at)} ${f.top}V${f.axis}`).join("")} />
      {f.yTicks.map((y) => <text key={y} class="num" x={f.left - 8} y={f.py(y) + 4} text-anchor="end">{tidy(String(Number((y / f.factor).toPrecision(6))))}</text>)}
      <text class="cap" x={0} y={13}>{title}</text>
      <path class="ax" d={`M${f.left} ${f.axis}H${f.right}` + f.xTicks.filter((t) => t.labelled).map((t) => `M${f.px(t.at)} ${f.axis}v5`).join("")} />
      {f.xTicks.filter((t) => t.labelled).map((t) => <text key={t.at} class="num" x={f.px(t.at)} y={f.axis + 18} text-anchor="middle">{f.along === "pot_resistance" ? format(t.at, "Ω").replace("Ω", "").trim() : tidy(String(t.at))}</text>)}
      <text class="cap" x={f.right} y={f.axis + 36} text-anchor="end">{names[f.along]}</text>
    </g>
  );
}

export function Strip({ f, data }: { f: Frame; data: FigureData }) {
  return (
    <g>
      <text class="cap" x={f.left} y={f.bottom + 24}>{f.narrow ? "residual, in u" : "residual: measured less predicted, in u"}</text>
      <rect class="band" x={f.left} y={f.pu(2)} width={f.right - f.left} height={f.pu(-2) - f.pu(2)} />
      <path class="ax" d={`M${f.left} ${f.strip}H${f.right}`} />
      <text class="num" x={f.left - 6} y={f.pu(2) + 4} text-anchor="end">+2 u</text>
      <text class="num" x={f.left - 6} y={f.pu(-2) + 4} text-anchor="end">−2 u</text>
      {data.series.flatMap((s, i) => s.dots.map((d) => {
        if (d.residual === null) return null;
        const [x, y] = [f.px(d.x, f.dodge(i) * 1.5), f.pu(d.residual)];
        const beyond = Math.abs(d.residual) > stripReach;
        return (
          <g key={d.index}>
            <path class="stem" d={`M${x} ${f.strip}V${y}`} />
            <circle class={d.hollow ? "pth" : "pt"} cx={x} cy={y} r={f.dot - 0.8} />
            {beyond && <text class="num caution" x={x + 5} y={y + (d.residual > 0 ? 1 : 7)}>{residual(d.residual)}</text>}
          </g>
        );
      }))}
    </g>
  );
}

/** "+5.2", "−12" */
export function residual(r: number): string {
  const s = Math.abs(r) < 10 ? r.toFixed(1) : r.toFixed(0);
  return tidy(r > 0 ? "+" + s : s);
}
