/**
 * Coefficients of a regression, a strip a term and a row an arm, every strip on a scale of its own that holds zero:
 * terms are measured in different units, and one scale for all would hide the small ones.
 */
import { scaleLinear } from 'd3-scale';
import { at, figure, label, rule, type Size, short, textWidth } from './figure.js';

export interface CoefficientRow {
  readonly arm: string;
  readonly estimate: number;
  readonly low: number;
  readonly high: number;
  /** The true value where it is known, else null. */
  readonly truth: number | null;
}

export interface CoefficientStrip {
  readonly term: string;
  readonly rows: readonly CoefficientRow[];
}

const HEAD = 20;
const ROW = 18;
const FOOT = 26;

/** Height a figure of these strips needs. */
export function coefficientsHeight(strips: readonly CoefficientStrip[]): number {
  return strips.reduce((sum, strip) => sum + HEAD + ROW * strip.rows.length + FOOT, 0);
}

/** @param arms - names of the arms in order, for the marks of a series */
export function coefficientsFigure(
  width: number,
  strips: readonly CoefficientStrip[],
  arms: readonly string[],
  title: string,
  described: string,
): string {
  const size: Size = { width, height: Math.max(20, coefficientsHeight(strips)) };
  const named = strips.some((strip) => strip.rows.length > 1 || strip.rows[0]?.arm !== arms[0]) && arms.length > 1;
  const left = named ? Math.min(0.4 * width, Math.max(...arms.map((arm) => textWidth(arm)), 30) + 14) : 8;
  const right = width - 14;
  const parts: string[] = [];
  let top = 0;
  for (const { term, rows } of strips) {
    const bottom = top + HEAD + ROW * rows.length;
    const values = rows.flatMap((r) => [r.low, r.high, r.estimate, ...(r.truth === null ? [] : [r.truth])]);
    const finite = values.filter(Number.isFinite);
    const x = scaleLinear()
      .domain([Math.min(0, ...finite), Math.max(0, ...finite)])
      .nice(4)
      .range([left, right]);
    parts.push(label(0, top + 13, term, 'start', 'f-head'));
    for (const t of x.ticks(Math.max(2, Math.floor((right - left) / 80)))) {
      parts.push(
        rule(x(t), top + HEAD, x(t), bottom, 'f-grid'),
        label(x(t), bottom + 13, short(t).replace('-', '−'), 'middle', 'f-soft'),
      );
    }
    parts.push(rule(x(0), top + HEAD - 2, x(0), bottom + 2, 'f-thin'));
    rows.forEach((r, k) => {
      const y = top + HEAD + (k + 0.5) * ROW;
      const series = Math.max(0, arms.indexOf(r.arm)) % 6;
      if (named) parts.push(label(left - 12, y + 4, r.arm, 'end'));
      if (r.truth !== null && Number.isFinite(r.truth))
        parts.push(rule(x(r.truth), y - ROW / 2 + 1, x(r.truth), y + ROW / 2 - 1, 'f-bar'));
      if (!Number.isFinite(r.estimate)) return;
      if (Number.isFinite(r.low) && Number.isFinite(r.high))
        parts.push(rule(x(r.low), y, x(r.high), y, `s s-${series}`));
      const clear = r.low > 0 || r.high < 0;
      parts.push(
        `<circle class="${clear ? `b-${series}` : 'f-open'}" cx="${at(x(r.estimate))}" cy="${at(y)}" r="4.2"/>`,
      );
    });
    top = bottom + FOOT;
  }
  return figure(size, title, described, parts.join(''));
}
