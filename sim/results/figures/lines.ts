/**
 * Lines over a shared axis, one an arm, with the band of the replicates behind each and its name at its end.
 *
 * Serves the frustrated share by generation, growth incidence, the Lorenz curve and the rank–rank plot.
 */
import { scaleLinear, scaleLog } from 'd3-scale';
import { area, line } from 'd3-shape';
import { at, DASHES, figure, label, rule, type Size, spread, textWidth } from './figure.js';

/** One line. `low` and `high` are its band, same length as `y`; NaN breaks a line. */
export interface Series {
  readonly name: string;
  readonly x: ArrayLike<number>;
  readonly y: ArrayLike<number>;
  readonly low?: ArrayLike<number>;
  readonly high?: ArrayLike<number>;
}

export interface LinesOptions {
  readonly title: string;
  readonly described: string;
  readonly xSays: string;
  readonly ySays: string;
  readonly xNames: (value: number) => string;
  readonly yNames: (value: number) => string;
  readonly xRange?: readonly [number, number];
  readonly yRange?: readonly [number, number];
  readonly yLog?: boolean;
  /** A value every line is read against: 1 for growth, drawn across. */
  readonly against?: number;
  /** Draws the diagonal of equality or of no mobility. */
  readonly diagonal?: string;
  /** A place on the x axis to mark: the generation shown. */
  readonly now?: number;
  readonly xTicks?: readonly number[];
}

export function linesFigure(size: Size, series: readonly Series[], o: LinesOptions): string {
  const names = series.map((s) => s.name);
  const inner = size.width >= 230;
  const right = inner ? Math.min(0.4 * size.width, Math.max(0, ...names.map((n) => textWidth(n))) + 12) : 8;
  const room = { left: 42, right: size.width - right, top: 20, bottom: size.height - 34 };
  const finite: number[] = [];
  for (const s of series) {
    for (const list of [s.y, s.low, s.high]) {
      if (list !== undefined) for (let k = 0; k < list.length; k++) if (Number.isFinite(list[k])) finite.push(list[k]);
    }
  }
  if (o.against !== undefined) finite.push(o.against);
  const xs = series.flatMap((s) => Array.from(s.x));
  const [x0, x1] = o.xRange ?? [Math.min(...xs), Math.max(...xs)];
  let [y0, y1] = o.yRange ?? [Math.min(...finite), Math.max(...finite)];
  if (!(y1 > y0)) [y0, y1] = [y0 - 0.5, y0 + 0.5];
  const x = scaleLinear().domain([x0, x1]).range([room.left, room.right]);
  const plain = o.yLog === true && y0 > 0 ? scaleLog() : scaleLinear();
  const y = plain.domain([y0, y1]).range([room.bottom, room.top]);
  if (o.yRange === undefined) y.nice(4);
  const parts: string[] = [];
  const yTicks = thinned(
    y.ticks(Math.max(2, Math.floor((room.bottom - room.top) / 34))),
    (room.bottom - room.top) / 24,
  );
  for (const t of yTicks) {
    parts.push(
      rule(room.left, y(t), room.right, y(t), 'f-grid'),
      label(room.left - 6, y(t) + 4, o.yNames(t), 'end', 'f-soft'),
    );
  }
  const xTicks = o.xTicks ?? x.ticks(Math.max(2, Math.floor((room.right - room.left) / 56)));
  for (const t of thinned([...xTicks], (room.right - room.left) / 26))
    parts.push(label(x(t), room.bottom + 15, o.xNames(t), 'middle', 'f-soft'));
  parts.push(rule(room.left, room.bottom, room.right, room.bottom, 'f-axis'));
  if (o.now !== undefined) parts.push(rule(x(o.now), room.top, x(o.now), room.bottom, 'f-dots'));
  if (o.against !== undefined) parts.push(rule(room.left, y(o.against), room.right, y(o.against), 'f-thin'));
  if (o.diagonal !== undefined) parts.push(rule(x(x0), y(Math.max(y0, x0)), x(x1), y(Math.min(y1, x1)), 'f-dots'));
  parts.push(
    label(room.left - 38, 10, o.ySays, 'start', 'f-soft'),
    label(room.right, size.height - 3, o.xSays, 'end', 'f-soft'),
  );
  series.forEach((s, k) => {
    const index = Array.from({ length: s.y.length }, (_, i) => i);
    if (s.low !== undefined && s.high !== undefined) {
      const { low, high } = s;
      const band = area<number>()
        .defined((i) => Number.isFinite(low[i]) && Number.isFinite(high[i]))
        .x((i) => x(s.x[i]))
        .y0((i) => y(low[i]))
        .y1((i) => y(high[i]))(index);
      if (band !== null) parts.push(`<path class="b b-${k % 6}" d="${rounded(band)}"/>`);
    }
    const path = line<number>()
      .defined((i) => Number.isFinite(s.y[i]))
      .x((i) => x(s.x[i]))
      .y((i) => y(s.y[i]))(index);
    const dash = DASHES[k % DASHES.length];
    if (path !== null)
      parts.push(
        `<path class="s s-${k % 6}"${dash === '' ? '' : ` stroke-dasharray="${dash}"`} d="${rounded(path)}"/>`,
      );
  });
  if (inner) {
    const ends = series.map((s) => {
      for (let i = s.y.length - 1; i >= 0; i--) if (Number.isFinite(s.y[i])) return { x: x(s.x[i]), y: y(s.y[i]) };
      return { x: room.right, y: room.bottom };
    });
    const heights = spread(
      ends.map((e) => e.y),
      15,
      room.top,
      room.bottom,
    );
    series.forEach((s, k) => {
      parts.push(label(room.right + 6, heights[k] + 4, s.name, 'start', `f-head l-${k % 6}`));
    });
  }
  return figure(size, o.title, o.described, parts.join(''));
}

/** Every second, third … of a list, until it fits. */
function thinned(ticks: readonly number[], most: number): number[] {
  const step = Math.max(1, Math.ceil(ticks.length / Math.max(1, most)));
  return ticks.filter((_, k) => k % step === 0);
}

function rounded(path: string): string {
  return path.replace(/\d+\.\d+/g, (v) => at(Number(v)));
}
