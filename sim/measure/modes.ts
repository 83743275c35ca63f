/**
 * Modes of a kernel density on a grid: how many heaps a distribution has, and where.
 *
 * Gaussian kernel with Silverman's bandwidth; counts heaps that stand out, not every ripple of a thin tail. Give it
 * log wealth: on raw wealth one bandwidth cannot serve both ends.
 */
import { exp, pow } from '../../network/elementary.js';
import { quantileOfSorted } from './quantile.js';
import { sampleOf, type Values } from './sample.js';
import { variance } from './spread.js';

/** A local maximum of the density that stands out. */
export interface Mode {
  /** Position, in the unit of the values, to a sixteenth of the bandwidth. */
  readonly at: number;
  /** Density there, per unit of the values. */
  readonly height: number;
}

/** Grid points per bandwidth. Linear binning then widens the kernel's variance by 1/(6 · 8²) = 0.3 %. */
const PER_BANDWIDTH = 8;
/** Kernel cut off at four bandwidths, where it has fallen to 0.03 % of its peak. */
const REACH = 4 * PER_BANDWIDTH;
/** Longest grid; a distribution wider than 4,096 / 8 bandwidths is given a coarser one. */
const LONGEST = 8192;
/**
 * A mode counts when the density falls by this share of the highest peak between it and any higher one. Silverman's
 * bandwidth smooths the body right and leaves ripples in the tails, which this leaves out.
 */
export const PROMINENCE = 0.05;

/**
 * Silverman's bandwidth: 0.9 min(sd, interquartile range / 1.34) n^(−1/5) (Silverman 1986, eq. 3.31).
 *
 * @returns in the unit of the values; sd has denominator n − 1; the sd alone when the quartiles coincide
 */
export function silvermanBandwidth(values: Values): number {
  const sample = sampleOf(values);
  const { n, value } = sample;
  if (n < 2) return 0;
  const sd = Math.sqrt((variance(sample) * n) / (n - 1));
  const iqr = quantileOfSorted(value, 0.75) - quantileOfSorted(value, 0.25);
  return 0.9 * (iqr > 0 ? Math.min(sd, iqr / 1.34) : sd) * pow(n, -0.2);
}

/**
 * Kernel density on an even grid that reaches four bandwidths beyond the data.
 *
 * @returns `density` per unit of the values at `origin + k · step`. Cost O(n + grid).
 */
export function gridDensity(
  values: Values,
  bandwidth: number,
): { readonly origin: number; readonly step: number; readonly density: Float64Array } {
  const { n, value } = sampleOf(values);
  const first = value[0];
  const range = value[n - 1] - first;
  const step = Math.max(bandwidth / PER_BANDWIDTH, range / (LONGEST - 2 * REACH - 2));
  const length = Math.ceil(range / step) + 2 * REACH + 2;
  const origin = first - REACH * step;
  const mass = new Float64Array(length);
  for (let i = 0; i < n; i++) {
    const at = (value[i] - origin) / step;
    const k = Math.floor(at);
    mass[k] += k + 1 - at;
    mass[k + 1] += at - k;
  }
  const kernel = new Float64Array(REACH + 1);
  let total = 0;
  for (let k = 0; k <= REACH; k++) {
    const u = (k * step) / bandwidth;
    kernel[k] = exp(-0.5 * u * u);
    total += k === 0 ? kernel[k] : 2 * kernel[k];
  }
  const density = new Float64Array(length);
  for (let s = 0; s < length; s++) {
    if (mass[s] === 0) continue;
    const m = mass[s] / (n * step * total);
    const low = Math.max(0, s - REACH);
    const high = Math.min(length - 1, s + REACH);
    for (let k = low; k <= high; k++) density[k] += m * kernel[Math.abs(k - s)];
  }
  return { origin, step, density };
}

/**
 * Modes of a kernel density.
 *
 * @param bandwidth - default `silvermanBandwidth(values)`
 * @returns the modes that stand out (see `PROMINENCE`), left to right; one when all values are equal, none for no rows
 */
export function densityModes(values: Values, bandwidth?: number): Mode[] {
  const sample = sampleOf(values);
  if (sample.n === 0) return [];
  const h = bandwidth ?? silvermanBandwidth(sample);
  const range = sample.value[sample.n - 1] - sample.value[0];
  // equal up to rounding: one heap, and no bandwidth to speak of
  if (!(h > 0) || range <= 1e-9 * Math.max(1, Math.abs(sample.value[0]))) {
    return [{ at: sample.mean, height: Infinity }];
  }
  const { origin, step, density } = gridDensity(sample, h);
  const peaks: Mode[] = [];
  let highest = 0;
  for (let k = 0; k < density.length; k++) if (density[k] > highest) highest = density[k];
  const fall = PROMINENCE * highest;
  // walk up and down, turning only when the way back is longer than `fall`
  let rising = true;
  let top = 0;
  let bottom = 0;
  for (let k = 0; k < density.length; k++) {
    const f = density[k];
    if (rising) {
      if (f > density[top]) top = k;
      if (density[top] - f >= fall && density[top] > f) {
        peaks.push({ at: origin + top * step, height: density[top] });
        rising = false;
        bottom = k;
      }
    } else {
      if (f < density[bottom]) bottom = k;
      if (f - density[bottom] >= fall) {
        rising = true;
        top = k;
      }
    }
  }
  return peaks;
}
