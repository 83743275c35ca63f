/**
 * Hartigan's dip: how far a distribution is from having one mode, with a p-value against the uniform.
 *
 * Algorithm of Hartigan and Hartigan (1985, Annals of Statistics 13; P. Hartigan 1985, AS 217): the greatest convex
 * minorant and the least concave majorant of the empirical distribution are compared on a modal interval that
 * shrinks until the gap between them no longer beats the misfit outside it. Ties are kept.
 */
import { DIP_PROBABILITIES, DIP_QUANTILES, DIP_SIZES } from './dip-table.js';
import { sampleOf, type Values } from './sample.js';

/** The dip and where the single mode would be. */
export interface Dip {
  /** Largest distance between the sample's distribution and the nearest one with a single mode; 1/(2n) … ¼. */
  readonly dip: number;
  /** Ends of the modal interval the algorithm settled on, in the unit of the values. */
  readonly low: number;
  readonly high: number;
  readonly n: number;
}

/** A hull of the empirical distribution over the modal interval: positions, and how many there are. */
interface Hull {
  readonly at: Uint32Array;
  length: number;
}

/**
 * Hartigan's dip statistic.
 *
 * @returns the dip, never below 1/(2n): values that are all equal or evenly spread have that one. NaN for no rows.
 *   Cost O(n) after the sort.
 */
export function dip(values: Values): Dip {
  const { n, value: x } = sampleOf(values);
  if (n === 0) return { dip: NaN, low: NaN, high: NaN, n };
  let low = 0;
  let high = n - 1;
  // in units of 1/(2n)
  let best = 1;
  if (n < 2 || x[0] === x[n - 1]) return { dip: best / (2 * n), low: x[0], high: x[n - 1], n };
  const below = minorantLinks(x);
  const above = majorantLinks(x);
  const convex: Hull = { at: new Uint32Array(n + 1), length: 0 };
  const concave: Hull = { at: new Uint32Array(n + 1), length: 0 };
  for (;;) {
    // the minorant runs down from high to low, the majorant up from low to high
    follow(convex, below, high, low);
    follow(concave, above, low, high);
    const gap = widestGap(x, convex, concave);
    if (gap.width < best) break;
    const misfit = Math.max(misfitBelow(x, convex, gap.convex), misfitAbove(x, concave, gap.concave));
    if (misfit > best) best = misfit;
    const nextLow = convex.at[gap.convex];
    const nextHigh = concave.at[gap.concave];
    if (nextLow === low && nextHigh === high) break;
    low = nextLow;
    high = nextHigh;
  }
  return { dip: best / (2 * n), low: x[low], high: x[high], n };
}

/** For each position the next vertex down of the greatest convex minorant that ends there. */
function minorantLinks(x: Float64Array): Uint32Array {
  const n = x.length;
  const link = new Uint32Array(n);
  for (let j = 1; j < n; j++) {
    let v = j - 1;
    while (v > 0) {
      const w = link[v];
      // keep v when the slope into it is smaller than the slope out of it
      if ((x[j] - x[v]) * (v - w) < (x[v] - x[w]) * (j - v)) break;
      v = w;
    }
    link[j] = v;
  }
  return link;
}

/** For each position the next vertex up of the least concave majorant that starts there. */
function majorantLinks(x: Float64Array): Uint32Array {
  const n = x.length;
  const link = new Uint32Array(n);
  link[n - 1] = n - 1;
  for (let j = n - 2; j >= 0; j--) {
    let v = j + 1;
    while (v < n - 1) {
      const w = link[v];
      if ((x[v] - x[j]) * (w - v) < (x[w] - x[v]) * (v - j)) break;
      v = w;
    }
    link[j] = v;
  }
  return link;
}

function follow(hull: Hull, link: Uint32Array, from: number, to: number): void {
  let length = 0;
  hull.at[length++] = from;
  for (let v = from; v !== to; ) {
    v = link[v];
    hull.at[length++] = v;
  }
  hull.length = length;
}

/** Largest gap between the hulls, and the vertices that bound it. */
function widestGap(x: Float64Array, convex: Hull, concave: Hull): { width: number; convex: number; concave: number } {
  const g = convex.at;
  const l = concave.at;
  const found = { width: 0, convex: convex.length - 1, concave: concave.length - 1 };
  if (convex.length === 2 && concave.length === 2) {
    found.width = 1;
    return found;
  }
  // upwards through both hulls, always taking the nearer vertex
  let i = convex.length - 2;
  let k = 1;
  for (;;) {
    const gx = g[i];
    const lx = l[k];
    if (gx > lx) {
      const from = g[i + 1];
      const width = lx - from + 1 - ((x[lx] - x[from]) * (gx - from)) / (x[gx] - x[from]);
      k++;
      if (width >= found.width) {
        found.width = width;
        found.convex = i + 1;
        found.concave = k - 1;
      }
    } else {
      const from = l[k - 1];
      const width = ((x[gx] - x[from]) * (lx - from)) / (x[lx] - x[from]) - (gx - from - 1);
      i--;
      if (width >= found.width) {
        found.width = width;
        found.convex = i + 1;
        found.concave = k;
      }
    }
    if (i < 0) i = 0;
    if (k > concave.length - 1) k = concave.length - 1;
    if (g[i] === l[k]) return found;
  }
}

/** Largest distance from the convex minorant below the modal interval up to the steps of the distribution. */
function misfitBelow(x: Float64Array, { at, length }: Hull, from: number): number {
  let worst = 0;
  for (let v = from; v < length - 1; v++) {
    const a = at[v + 1];
    const b = at[v];
    let here = 1;
    if (b - a > 1 && x[b] !== x[a]) {
      const slope = (b - a) / (x[b] - x[a]);
      for (let j = a; j <= b; j++) {
        const d = j - a + 1 - (x[j] - x[a]) * slope;
        if (d > here) here = d;
      }
    }
    if (here > worst) worst = here;
  }
  return worst;
}

/** Largest distance from the concave majorant above the modal interval down to the steps of the distribution. */
function misfitAbove(x: Float64Array, { at, length }: Hull, from: number): number {
  let worst = 0;
  for (let v = from; v < length - 1; v++) {
    const a = at[v];
    const b = at[v + 1];
    let here = 1;
    if (b - a > 1 && x[b] !== x[a]) {
      const slope = (b - a) / (x[b] - x[a]);
      for (let j = a; j <= b; j++) {
        const d = (x[j] - x[a]) * slope - (j - a - 1);
        if (d > here) here = d;
      }
    }
    if (here > worst) worst = here;
  }
  return worst;
}

/**
 * p-value of a dip against the uniform distribution, the hardest single-mode case in practice.
 *
 * Interpolates √n × quantile linearly between the two sizes of the table around n, then linearly in probability;
 * clamped at the table's ends, so 0 means below 1e−5; beyond the largest size its row is used. 1 for n ≤ 3.
 */
export function dipPValue(statistic: number, n: number): number {
  if (n <= 3) return 1;
  const rows = DIP_SIZES.length;
  let a = rows - 1;
  while (a > 0 && DIP_SIZES[a] > n) a--;
  const beyond = n >= DIP_SIZES[rows - 1];
  const b = beyond ? a : a + 1;
  const share = beyond ? 0 : (n - DIP_SIZES[a]) / (DIP_SIZES[b] - DIP_SIZES[a]);
  const rootA = Math.sqrt(DIP_SIZES[a]);
  const rootB = Math.sqrt(DIP_SIZES[b]);
  const scaled = Math.sqrt(n) * statistic;
  const at = (c: number): number => {
    const low = rootA * DIP_QUANTILES[a][c];
    return low + share * (rootB * DIP_QUANTILES[b][c] - low);
  };
  const last = DIP_PROBABILITIES.length - 1;
  // the smallest dip a sample can have: every sample reaches it (room for the rounding of two square roots)
  if (scaled <= at(0) * (1 + 1e-12)) return 1;
  if (scaled >= at(last)) return 1 - DIP_PROBABILITIES[last];
  let c = 0;
  while (at(c + 1) <= scaled) c++;
  const low = at(c);
  const part = (scaled - low) / (at(c + 1) - low);
  return 1 - (DIP_PROBABILITIES[c] + part * (DIP_PROBABILITIES[c + 1] - DIP_PROBABILITIES[c]));
}

/** The dip with its p-value. */
export function dipTest(values: Values): { readonly dip: number; readonly p: number; readonly n: number } {
  const { dip: statistic, n } = dip(values);
  return { dip: statistic, p: n === 0 ? NaN : dipPValue(statistic, n), n };
}
