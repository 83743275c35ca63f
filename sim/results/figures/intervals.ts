/**
 * Estimates with their intervals, one a row: contrasts between arms, or coefficients of regressions.
 */
import { scaleLinear } from 'd3-scale';
import { at, figure, label, rule, type Size, short, textWidth } from './figure.js';

export interface Interval {
  readonly name: string;
  readonly estimate: number;
  readonly low: number;
  readonly high: number;
  /** Series of the mark when rows hold several (arms), 0 by default. */
  readonly series?: number;
}

/** Height a figure of so many rows needs. */
export function intervalsHeight(rows: number): number {
  return rows * 20 + 38;
}

export function intervalsFigure(
  size: Size,
  rows: readonly Interval[],
  o: {
    readonly title: string;
    readonly described: string;
    readonly xSays: string;
    readonly names?: (v: number) => string;
  },
): string {
  const named = o.names ?? short;
  const left = Math.min(0.45 * size.width, Math.max(60, ...rows.map((r) => textWidth(r.name))) + 12);
  const room = { left, right: size.width - 12, top: 4, bottom: size.height - 34 };
  const finite = rows.flatMap((r) => [r.low, r.high, r.estimate]).filter(Number.isFinite);
  const x = scaleLinear()
    .domain([Math.min(0, ...finite), Math.max(0, ...finite)])
    .nice(4)
    .range([room.left, room.right]);
  const step = (room.bottom - room.top) / Math.max(1, rows.length);
  const parts: string[] = [];
  for (const t of x.ticks(Math.max(2, Math.floor((room.right - room.left) / 70)))) {
    parts.push(
      rule(x(t), room.top, x(t), room.bottom, 'f-grid'),
      label(x(t), room.bottom + 15, named(t), 'middle', 'f-soft'),
    );
  }
  parts.push(rule(x(0), room.top, x(0), room.bottom, 'f-thin'));
  rows.forEach((r, k) => {
    const y = room.top + (k + 0.5) * step;
    parts.push(label(room.left - 10, y + 4, r.name, 'end'));
    if (!Number.isFinite(r.estimate)) return;
    if (Number.isFinite(r.low) && Number.isFinite(r.high))
      parts.push(rule(x(r.low), y, x(r.high), y, `s s-${r.series ?? 0}`));
    // filled when the interval leaves zero out
    const clear = r.low > 0 || r.high < 0;
    parts.push(
      `<circle class="${clear ? `b-${r.series ?? 0}` : 'f-open'}" cx="${at(x(r.estimate))}" cy="${at(y)}" r="4.2"/>`,
    );
  });
  parts.push(label(room.right, size.height - 1, o.xSays, 'end', 'f-soft'));
  return figure(size, o.title, o.described, parts.join(''));
}
