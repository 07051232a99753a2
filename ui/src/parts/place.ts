// Puts words where they cover least: a few candidate boxes, the emptiest wins. Pure.

export interface Box { x: number; y: number; w: number; h: number }

/** About the width of a label in the figures' sans at 12.5 px. */
export function labelWidth(s: string): number {
  return s.length * 6.6;
}

// Marks are kept in columns this wide, one to a cell this fine, px: a night of thousands of points stays quick.
const column = 16;
const cell = 3;

export class Room {
  private readonly columns = new Map<number, [number, number][]>();
  private readonly cells = new Set<number>();
  private readonly taken: Box[] = [];

  constructor(private readonly within: Box) {}

  /** A mark that words should not cover. */
  mark(x: number, y: number) {
    const key = Math.round(x / cell) * 10_000 + Math.round(y / cell);
    if (this.cells.has(key)) return;
    this.cells.add(key);
    const c = Math.floor(x / column);
    const there = this.columns.get(c);
    if (there) there.push([x, y]);
    else this.columns.set(c, [[x, y]]);
  }

  /** Marks along a polyline, closer than a letter is wide. */
  markLine(line: readonly (readonly [number, number])[]) {
    for (let i = 1; i < line.length; i++) {
      const [[x0, y0], [x1, y1]] = [line[i - 1]!, line[i]!];
      const n = Math.max(1, Math.ceil(Math.hypot(x1 - x0, y1 - y0) / 5));
      for (let k = 0; k < n; k++) this.mark(x0 + ((x1 - x0) * k) / n, y0 + ((y1 - y0) * k) / n);
    }
  }

  take(b: Box) {
    this.taken.push(b);
  }

  /** The emptiest of the boxes, which is then taken; null when even that covers more than `most` marks. */
  place<T extends Box>(boxes: readonly T[], most = Infinity): T | null {
    let best: T | null = null;
    let least = Infinity;
    for (const b of boxes) {
      const c = this.cost(b);
      if (c < least) [best, least] = [b, c];
    }
    if (!best || least > most) return null;
    this.take(best);
    return best;
  }

  private cost(b: Box): number {
    const v = this.within;
    if (b.x < v.x || b.y < v.y || b.x + b.w > v.x + v.w || b.y + b.h > v.y + v.h) return 1000;
    let c = 0;
    for (const t of this.taken) if (b.x < t.x + t.w && t.x < b.x + b.w && b.y < t.y + t.h && t.y < b.y + b.h) c += 100;
    const [x0, x1] = [b.x - 3, b.x + b.w + 3];
    for (let k = Math.floor(x0 / column); k <= x1 / column; k++)
      for (const [x, y] of this.columns.get(k) ?? []) if (x > x0 && x < x1 && y > b.y - 2 && y < b.y + b.h + 2) c++;
    return c;
  }
}

/** At most n of them, evenly spread: enough places to try. */
export function some<T>(all: readonly T[], n: number): T[] {
  const step = Math.max(1, all.length / n);
  return Array.from({ length: Math.min(n, all.length) }, (_, i) => all[Math.floor(i * step)]!);
}

/** Moves labels apart to at least `gap`, keeping their order and staying near. */
export function spread(ys: readonly number[], gap: number): number[] {
  const order = ys.map((y, i) => ({ y, i })).sort((a, b) => a.y - b.y);
  for (let pass = 0; pass < 20; pass++)
    for (let k = 1; k < order.length; k++) {
      const [a, b] = [order[k - 1]!, order[k]!];
      const lack = gap - (b.y - a.y);
      if (lack > 0) {
        a.y -= lack / 2;
        b.y += lack / 2;
      }
    }
  const out = [...ys];
  for (const o of order) out[o.i] = o.y;
  return out;
}
