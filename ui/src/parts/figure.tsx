// Measured against predicted: ink dots on pencil lines, the residual in a strip beneath.
// SVG of our own rather than a plotting library: the marks (brackets, arrows with a word,
// hollow dots, labels at the curve's end) are this log's, they take their ink from the
// page's tokens in both lights and in print, and they can be named to a screen reader.
import { useMemo } from "preact/hooks";
import type { Curve, Point, Quantity, Setpoint } from "../data/nouns";
import { prefixFor } from "../data/format";
import { sentenceCase, titled } from "../data/words";
import { caption, description } from "./figurewords";
import { frame, type Frame } from "./frame";
import { Axes, Strip } from "./axes";
import { annotate, type Annotations } from "./annotate";
import { figureData, type FigureData, type Series } from "./series";
import { Table } from "./pointstable";
import { useWidth } from "./width";

/** Where the run is at this moment. */
export interface Now { setpoint: Setpoint; repeat: number; repeats: number; word: "now" | "then" }

export interface FigureProps {
  quantity: Quantity;
  points: readonly Point[];
  curves: readonly Curve[];
  setpoints: readonly Setpoint[];
  now: Now | null;
}

export function Figure(props: FigureProps) {
  const [box, width] = useWidth<HTMLElement>();
  const { quantity, points, curves, setpoints, now } = props;
  // Drawn again only when something in it changed: the page around it changes twice a second.
  const drawn = useMemo(() => draw(props, width), [quantity, points, curves, setpoints, width, now?.setpoint.index, now?.repeat, now?.word]);
  return (
    <figure ref={box}>
      {drawn}
      <Table quantity={quantity} points={points} />
    </figure>
  );
}

function draw({ quantity, points, curves, setpoints, now }: FigureProps, width: number) {
  const data = figureData(quantity, points, curves, setpoints);
  if (!data.series.length) return <figcaption>{sentenceCase(titled(quantity))}: no points and no prediction yet.</figcaption>;
  const f = frame(data, setpoints, width);
  return (
    <>
      <svg class="fig" width={f.width} height={f.height} viewBox={`0 0 ${f.width} ${f.height}`} role="img" aria-label={description(data, points)}>
        <Axes f={f} title={title(data, f)} />
        {data.series.map((s) => <path key={s.supply} class="band" d={f.bandPath(s)} />)}
        {data.series.map((s) => <path key={s.supply} class="pencil" d={f.linePath(s.x, s.value)} />)}
        {data.series.map((s, i) => <Measured key={s.supply} f={f} s={s} dx={f.dodge(i)} />)}
        <Strip f={f} data={data} />
        <Notes notes={annotate(f, data, now)} />
      </svg>
      <figcaption>{caption(data)}</figcaption>
    </>
  );
}

function title(d: FigureData, f: Frame): string {
  const unit = d.unit === "1" || !d.unit ? "" : `, ${prefixFor(f.factor, d.unit)[0]}${d.unit}`;
  return titled(d.quantity) + unit;
}

function Measured({ f, s, dx }: { f: Frame; s: Series; dx: number }) {
  const joins = s.passes.flatMap((p) => p.runs).filter((r) => r.length > 1);
  return (
    <g class="dots">
      {joins.map((r) => <path key={r[0]!.index} class="join" d={"M" + r.map((d) => `${f.px(d.x, dx)} ${f.py(d.y)}`).join("L")} />)}
      {s.dots.map((d) => {
        const [x, y] = [f.px(d.x, dx), f.py(d.y)];
        const [top, bottom] = [f.clampY(d.y + 2 * d.u), f.clampY(d.y - 2 * d.u)];
        return (
          <g key={d.index}>
            {bottom - top > 2 * f.dot && <path class="eb" d={`M${x} ${top}V${bottom}`} />}
            <circle class={d.hollow ? "pth" : "pt"} cx={x} cy={y} r={f.dot} />
          </g>
        );
      })}
    </g>
  );
}

function Notes({ notes }: { notes: Annotations }) {
  return (
    <g>
      {notes.lines.map((l, i) => <path key={i} class={l.mark} d={l.d} />)}
      {notes.labels.map((l, i) => <text key={i} class={l.mark} x={l.x} y={l.y} text-anchor={l.anchor}>{l.text}</text>)}
    </g>
  );
}
