/**
 * Random geometric ties: the nearest pairs of households in the plane are tied (Gilbert 1961; Penrose 2003).
 *
 * The map is a unit square whose opposite sides meet, so that no household lives at an edge. Places sit on the cells
 * of a square grid, in random order. A household lies at its place's point plus `spread` times a uniform draw over the
 * whole square: `spread` 0 puts a place on one spot (ties leave a place only when it is too small for them), 1 scatters
 * everybody alike, so that place means nothing. The n · mean_degree / 2 nearest pairs are tied: the same as one radius
 * for all, chosen to give the mean degree. Dense places therefore have more ties a household than thin ones.
 */
import type { Labels, Ties, Uniform } from '../graph.js';
import { cells, shuffled } from './order.js';
import { PairList } from './pair-list.js';
import { checkMeanDegree, checkShare, infeasible } from './refuse.js';
import type { SpatialSpec } from './spec.js';

/** On one spot, households still differ by up to this much, so that "nearest" is decided by chance. */
const SPOT = 1e-4;
/** Households whose surroundings are measured when the radius is sought, and the most distances kept for that. */
const SAMPLE = 2000;
const DISTANCES = 2_000_000;
/** The sample errs by about a hundredth; a radius this much too generous is sure to hold the wanted pairs. */
const MARGIN = 1.12;

/**
 * @param spec - `mean_degree` in 0 … n−1; `spread` in 0 … 1
 * @param labels - places; groups and wealth play no part
 * @returns ties, exactly the nearest integer to n · mean_degree / 2. Cost O(n + m) expected.
 * @throws InputError `network-infeasible` when there are too few households, or places on one spot are too small
 */
export function spatial(spec: SpatialSpec, labels: Labels, uniform: Uniform): Ties {
  const { n } = labels;
  checkMeanDegree('mean_degree', spec.mean_degree, n);
  checkShare('spread', spec.spread);
  const wanted = Math.min(Math.round((n * spec.mean_degree) / 2), (n * (n - 1)) / 2);
  const out = new PairList(wanted);
  if (wanted === 0) return out.toTies(n);
  const { x, y } = positions(spec.spread, labels, uniform);

  let radius = firstRadius(x, y, wanted, spec, labels, uniform);
  for (;;) {
    const near = pairsWithin(x, y, radius, 3 * wanted + 1e6);
    if (near === null) {
      throw infeasible(
        'spread',
        `with a spread of ${spec.spread} places are too small for ${spec.mean_degree} ties each, and whole places would merge`,
        'raise spread, lower mean_degree, or make places larger',
      );
    }
    if (near.squared.length >= wanted) {
      const limit = smallest(near.squared, wanted);
      // pairs at exactly the last distance: take as many as are still missing
      let spare = wanted;
      for (let e = 0; e < near.squared.length; e++) if (near.squared[e] < limit) spare--;
      for (let e = 0; e < near.squared.length; e++) {
        if (near.squared[e] < limit || (near.squared[e] === limit && spare-- > 0)) out.push(near.a[e], near.b[e]);
      }
      return out.toTies(n);
    }
    if (radius >= 0.5) {
      // every pair is within half the map's diagonal of each other: small n, dense ties
      return nearestOfAll(x, y, wanted, out);
    }
    radius = Math.min(0.5, radius * 1.15);
  }
}

function positions(spread: number, labels: Labels, uniform: Uniform): { x: Float64Array; y: Float64Array } {
  const { n, place } = labels;
  const { places } = cells({ ...labels, group: new Uint32Array(n) });
  const side = Math.ceil(Math.sqrt(places));
  const spot = shuffled(side * side, uniform);
  const scale = Math.max(spread, SPOT);
  const x = new Float64Array(n);
  const y = new Float64Array(n);
  for (let i = 0; i < n; i++) {
    const cell = spot[place[i]];
    x[i] = wrap(((cell % side) + 0.5) / side + scale * (uniform() - 0.5));
    y[i] = wrap((Math.floor(cell / side) + 0.5) / side + scale * (uniform() - 0.5));
  }
  return { x, y };
}

function wrap(u: number): number {
  const v = u - Math.floor(u);
  return v < 1 ? v : 0;
}

/** Squared distance on the square whose sides meet. */
function squaredDistance(dx: number, dy: number): number {
  dx = Math.abs(dx);
  dy = Math.abs(dy);
  if (dx > 0.5) dx = 1 - dx;
  if (dy > 0.5) dy = 1 - dy;
  return dx * dx + dy * dy;
}

/** A square grid over the map, hashed, so that fine grids cost no more than the households in them. */
class Grid {
  readonly columns: number;
  private readonly x: Float64Array;
  private readonly y: Float64Array;
  private readonly mask: number;
  private readonly bucketStart: Uint32Array;
  /** Households sorted by bucket. */
  readonly member: Uint32Array;
  private readonly key: Float64Array;

  constructor(x: Float64Array, y: Float64Array, cell: number) {
    const n = x.length;
    this.x = x;
    this.y = y;
    // at least 3 columns, so that the nine cells round a household are nine different ones
    this.columns = Math.max(3, Math.min(Math.floor(1 / cell), 33_554_432));
    let buckets = 16;
    while (buckets < n) buckets *= 2;
    this.mask = buckets - 1;
    this.key = new Float64Array(n);
    const bucket = new Uint32Array(n);
    this.bucketStart = new Uint32Array(buckets + 1);
    for (let i = 0; i < n; i++) {
      this.key[i] = this.keyOf(this.column(x[i]), this.column(y[i]));
      bucket[i] = this.bucketOf(this.key[i]);
      this.bucketStart[bucket[i] + 1]++;
    }
    for (let b = 0; b < buckets; b++) this.bucketStart[b + 1] += this.bucketStart[b];
    const fill = this.bucketStart.slice(0, buckets);
    this.member = new Uint32Array(n);
    for (let i = 0; i < n; i++) this.member[fill[bucket[i]]++] = i;
  }

  private column(u: number): number {
    return Math.min(this.columns - 1, Math.floor(u * this.columns));
  }

  private keyOf(cx: number, cy: number): number {
    return cx * this.columns + cy;
  }

  private bucketOf(key: number): number {
    let h = Math.imul((key | 0) ^ Math.imul(Math.floor(key / 4294967296) | 0, 0x9e3779b1), 0x85ebca6b);
    h ^= h >>> 15;
    h = Math.imul(h, 0xc2b2ae35);
    return ((h ^ (h >>> 13)) >>> 0) & this.mask;
  }

  /** Calls `found(j, squared distance)` for every household within `radius` (≤ one cell) of i, i left out. */
  around(i: number, radius: number, found: (j: number, squared: number) => void): void {
    const { x, y, columns, member, bucketStart, key } = this;
    const limit = radius * radius;
    const cx = this.column(x[i]);
    const cy = this.column(y[i]);
    for (let dx = -1; dx <= 1; dx++) {
      for (let dy = -1; dy <= 1; dy++) {
        const k = this.keyOf((cx + dx + columns) % columns, (cy + dy + columns) % columns);
        const b = this.bucketOf(k);
        for (let at = bucketStart[b]; at < bucketStart[b + 1]; at++) {
          const j = member[at];
          if (key[j] !== k || j === i) continue;
          const squared = squaredDistance(x[i] - x[j], y[i] - y[j]);
          if (squared <= limit) found(j, squared);
        }
      }
    }
  }
}

/** A radius that should hold a little more than the wanted pairs, from counts round a sample of households. */
function firstRadius(
  x: Float64Array,
  y: Float64Array,
  wanted: number,
  spec: SpatialSpec,
  labels: Labels,
  uniform: Uniform,
): number {
  const { n } = labels;
  const degree = (2 * wanted) / n;
  const { places } = cells({ ...labels, group: new Uint32Array(n) });
  const scale = Math.max(spec.spread, SPOT);
  const density = Math.max(n, n / (places * scale * scale));
  let radius = Math.min(0.5, 1.5 * Math.sqrt(degree / (Math.PI * density)));
  const sampled = Math.min(n, SAMPLE);
  for (;;) {
    const grid = new Grid(x, y, radius);
    const squared: number[] = [];
    let looked = 0;
    while (looked < sampled && squared.length < DISTANCES) {
      const i = sampled === n ? looked : Math.floor(uniform() * n);
      grid.around(i, radius, (_j, d) => {
        squared.push(d);
      });
      looked++;
    }
    const needed = Math.ceil(MARGIN * degree * looked);
    if (squared.length > needed) return Math.sqrt(Float64Array.from(squared).sort()[needed]);
    if (radius >= 0.5) return radius;
    radius = Math.min(0.5, 2 * radius);
  }
}

/** Every pair within `radius`, or null when there are more than `most`. */
function pairsWithin(
  x: Float64Array,
  y: Float64Array,
  radius: number,
  most: number,
): { a: Uint32Array; b: Uint32Array; squared: Float64Array } | null {
  const n = x.length;
  const grid = new Grid(x, y, radius);
  const list = new PairList(most / 3);
  let squared = new Float64Array(Math.ceil(most / 2));
  let full = false;
  for (let i = 0; i < n && !full; i++) {
    grid.around(i, radius, (j, s) => {
      if (j < i) return;
      if (list.length >= most) {
        full = true;
        return;
      }
      if (list.length === squared.length) {
        const more = new Float64Array(2 * squared.length);
        more.set(squared);
        squared = more;
      }
      squared[list.length] = s;
      list.push(i, j);
    });
  }
  if (full) return null;
  const { source, target } = list.ends();
  return { a: source, b: target, squared: squared.subarray(0, list.length) };
}

/** The k-th smallest value (k from 1), by a full sort of a copy: the lists here are a few times the ties. */
function smallest(values: Float64Array, k: number): number {
  return values.slice().sort()[k - 1];
}

/** The nearest pairs out of all n(n−1)/2, for small dense populations where no radius under half the map suffices. */
function nearestOfAll(x: Float64Array, y: Float64Array, wanted: number, out: PairList): Ties {
  const n = x.length;
  const pairs: { i: number; j: number; squared: number }[] = [];
  for (let i = 0; i < n; i++) {
    for (let j = i + 1; j < n; j++) pairs.push({ i, j, squared: squaredDistance(x[i] - x[j], y[i] - y[j]) });
  }
  pairs.sort((a, b) => a.squared - b.squared || a.i - b.i || a.j - b.j);
  for (const { i, j } of pairs.slice(0, wanted)) out.push(i, j);
  return out.toTies(n);
}
