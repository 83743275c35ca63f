/**
 * The wealth pyramid: both arms' log-wealth densities back to back on the axis the fields share, stacked by status.
 *
 * Two peaks in one arm are polarisation at a glance. Draws only; the densities of a glide are in between.
 */
import { nothing, render, svg } from 'lit-html';
import type { Snapshot } from '../data/source.js';
import type { Axis } from '../field/arrangement.js';
import { amount } from '../screen/words.js';

export interface PyramidFrame {
  readonly left: Snapshot;
  readonly right: Snapshot;
  readonly axis: Axis;
}

export interface PyramidDrawing {
  readonly from: PyramidFrame | null;
  readonly to: PyramidFrame;
  /** Share of the glide done. */
  readonly share: number;
  readonly axis: Axis;
  readonly width: number;
  readonly height: number;
  readonly rem: number;
  /** Height of a wealth, CSS pixels from the top. */
  readonly y: (wealth: number) => number;
  /** Round wealths to name. */
  readonly rungs: readonly number[];
}

/** Counts by bin of log wealth: all households, and the frustrated among them, as shares of all. */
export interface Density {
  readonly all: Float64Array;
  readonly frustrated: Float64Array;
  readonly mean: number;
  readonly median: number;
  /** False where nobody has decided yet. */
  readonly decided: boolean;
}

const BINS = 30;
const cache = new WeakMap<Snapshot, { low: number; high: number; density: Density }>();

/** Density of a snapshot on an axis; kept, since a glide asks again every frame. Cost O(n log n) once. */
export function densityOf(snapshot: Snapshot, axis: Axis): Density {
  const kept = cache.get(snapshot);
  if (kept !== undefined && kept.low === axis.low && kept.high === axis.high) return kept.density;
  const { wealth, met, decided } = snapshot;
  const n = wealth.length;
  const all = new Float64Array(BINS);
  const frustrated = new Float64Array(BINS);
  let sum = 0;
  for (let i = 0; i < n; i++) {
    sum += wealth[i];
    const at = wealth[i] > 0 ? ((Math.log(wealth[i]) - axis.low) / (axis.high - axis.low)) * BINS : 0;
    const bin = Math.max(0, Math.min(BINS - 1, Math.floor(at)));
    all[bin] += 1 / n;
    if (decided && met[i] === 0) frustrated[bin] += 1 / n;
  }
  const sorted = wealth.slice().sort();
  const density = { all, frustrated, mean: sum / n, median: sorted[Math.floor(n / 2)], decided };
  cache.set(snapshot, { low: axis.low, high: axis.high, density });
  return density;
}

export function drawPyramid(target: SVGSVGElement, d: PyramidDrawing): void {
  const { width, height, rem, to, from, share } = d;
  if (width < 10) return;
  target.setAttribute('viewBox', `0 0 ${width} ${height}`);
  const gap = 1.35 * rem;
  const reach = width / 2 - gap - 0.75 * rem;
  const sides = (['left', 'right'] as const).map((side) => {
    const b = densityOf(to[side], to.axis);
    const a = from === null || share >= 1 ? b : densityOf(from[side], from.axis);
    return { a, b };
  });
  let most = 0;
  const at = (p: Float64Array, q: Float64Array, k: number): number => p[k] + (q[k] - p[k]) * share;
  for (const { a, b } of sides) for (let k = 0; k < BINS; k++) most = Math.max(most, at(a.all, b.all, k));
  const scale = reach / Math.max(most, 1e-9);
  const wealthAt = (k: number): number => Math.exp(d.axis.low + (k / BINS) * (d.axis.high - d.axis.low));
  const middle = width / 2;
  const bars = sides.map(({ a, b }, s) => {
    const sign = s === 0 ? -1 : 1;
    const zero = middle + sign * gap;
    const list: unknown[] = [];
    for (let k = 0; k < BINS; k++) {
      const all = at(a.all, b.all, k) * scale;
      if (all < 0.05) continue;
      const low = at(a.frustrated, b.frustrated, k) * scale;
      const y1 = d.y(wealthAt(k));
      const y0 = d.y(wealthAt(k + 1));
      const h = Math.max(0.6, y1 - y0 - Math.max(0.8, 0.07 * rem));
      const rect = (from0: number, wide: number, name: string): unknown =>
        wide < 0.05
          ? nothing
          : svg`<rect class=${name} x=${sign > 0 ? zero + from0 : zero - from0 - wide} y=${y0} width=${wide} height=${h}></rect>`;
      list.push(rect(0, low, 'bar-frustrated'), rect(low, all - low, b.decided ? 'bar-satisfied' : 'bar-quiet'));
    }
    const mark = (value: number, name: string): unknown => {
      const y = d.y(value);
      return svg`<line class=${name} x1=${zero - sign * 0.15 * rem} x2=${zero + sign * (reach + 0.1 * rem)} y1=${y} y2=${y}></line>`;
    };
    return svg`${list}${mark(a.median + (b.median - a.median) * share, 'median')}${mark(a.mean + (b.mean - a.mean) * share, 'mean')}`;
  });
  const top = 2.4 * rem;
  const bottom = height - 2.2 * rem;
  const names = d.rungs
    .map((w) => ({ w, y: d.y(w) }))
    .filter(({ y }) => y > top + 0.6 * rem && y < bottom)
    .map(
      ({ w, y }) =>
        svg`<text class="axis-text" x=${middle} y=${y + 0.34 * rem} text-anchor="middle">${amount(w)}</text>`,
    );
  const half = 3.0 * rem;
  const foot = height - 0.78 * rem;
  render(
    svg`<title>${`Wealth of both arms, back to back. Medians ${amount(sides[0].b.median)} and ${amount(sides[1].b.median)}.`}</title>
      <clipPath id="pyramid-cut"><rect x="0" y=${top} width=${width} height=${Math.max(0, bottom - top)}></rect></clipPath>
      <text class="axis-title" x=${middle} y=${1.5 * rem} text-anchor="middle">wealth</text>
      <g clip-path="url(#pyramid-cut)">${bars}</g>${names}
      <line class="median" x1=${middle - half - 1.35 * rem} x2=${middle - half} y1=${foot - 0.3 * rem} y2=${foot - 0.3 * rem}></line>
      <text class="axis-text" x=${middle - half + 0.25 * rem} y=${foot}>median</text>
      <line class="mean" x1=${middle + 0.5 * rem} x2=${middle + 1.85 * rem} y1=${foot - 0.3 * rem} y2=${foot - 0.3 * rem}></line>
      <text class="axis-text" x=${middle + 2.1 * rem} y=${foot}>mean</text>`,
    target as unknown as HTMLElement,
  );
}
