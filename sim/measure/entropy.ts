/**
 * Measures built on ratios to the mean: Theil T and L, their split by classes, GE(2), and Atkinson's family.
 *
 * With r = y/μ, each Theil term is written so that it is never negative (r ln r − r + 1 and r − 1 − ln r: the extra
 * parts sum to 0), which keeps them accurate near equality. A zero takes its limit: 0 ln 0 = 0 in T, L infinite,
 * Atkinson 1 for aversion ≥ 1. A negative value gives NaN. `positiveOnly` leaves both out and retakes the mean.
 */
import { exp, log, pow } from '../../network/elementary.js';
import { groupingOf, isSample, type Sample, sampleOf, type Values, type Weighting } from './sample.js';

/** Five measures from one pass over the data. */
export interface RatioMeasures {
  readonly theilT: number;
  readonly theilL: number;
  readonly atkinsonHalf: number;
  readonly atkinson1: number;
  readonly atkinson2: number;
}

/** Theil T and L and Atkinson at aversion ½, 1 and 2 together; one logarithm per row. Cost O(n) after the sort. */
export function ratioMeasures(values: Values, weighting?: Weighting): RatioMeasures {
  const { n, value, weight, total, mean } = sampleOf(values, weighting);
  if (!(mean > 0) || value[0] < 0) {
    return { theilT: NaN, theilL: NaN, atkinsonHalf: NaN, atkinson1: NaN, atkinson2: NaN };
  }
  let t = 0;
  let l = 0;
  let root = 0;
  let inverse = 0;
  for (let k = 0; k < n; k++) {
    const w = weight === null ? 1 : weight[k];
    if (w === 0) continue;
    const r = value[k] / mean;
    const ln = log(r);
    t += w * (r > 0 ? r * ln - (r - 1) : 1);
    l += w * (r - 1 - ln);
    root += w * Math.sqrt(r);
    inverse += w / r;
  }
  root /= total;
  return {
    theilT: t / total,
    theilL: l / total,
    atkinsonHalf: 1 - root * root,
    atkinson1: 1 - exp(-l / total),
    atkinson2: 1 - total / inverse,
  };
}

/** Theil T, GE(1): mean of r ln r with r = y/μ (Theil 1967). 0 … ln n; zeros count as 0 ln 0 = 0. */
export function theilT(values: Values, weighting?: Weighting): number {
  return ratioMeasures(values, weighting).theilT;
}

/** Theil L, GE(0), the mean log deviation: mean of −ln r with r = y/μ. Infinite when a value is 0. */
export function theilL(values: Values, weighting?: Weighting): number {
  return ratioMeasures(values, weighting).theilL;
}

/** GE(2), half the squared coefficient of variation: (mean of r² − 1)/2. NaN unless the mean is above 0. */
export function generalisedEntropy2(values: Values, weighting?: Weighting): number {
  const { n, value, weight, total, mean } = sampleOf(values, weighting);
  if (!(mean > 0)) return NaN;
  let sum = 0;
  for (let k = 0; k < n; k++) {
    const d = value[k] / mean - 1;
    sum += weight === null ? d * d : weight[k] * d * d;
  }
  return sum / (2 * total);
}

/**
 * Atkinson's index (Atkinson 1970): 1 − (mean of r^(1−ε))^(1/(1−ε)), and 1 − exp(mean of ln r) at ε = 1.
 *
 * @param aversion - ε > 0
 * @returns 0 … 1, the share of the total that could be given up for equality at the same welfare
 * @throws {RangeError} if the aversion is not above 0
 */
export function atkinson(values: Values, aversion: number, weighting?: Weighting): number {
  if (!(aversion > 0)) throw new RangeError(`aversion must be above 0, got ${aversion}`);
  const sample = sampleOf(values, weighting);
  if (aversion === 0.5) return ratioMeasures(sample).atkinsonHalf;
  if (aversion === 1) return ratioMeasures(sample).atkinson1;
  if (aversion === 2) return ratioMeasures(sample).atkinson2;
  const { n, value, weight, total, mean } = sample;
  if (!(mean > 0) || value[0] < 0) return NaN;
  let sum = 0;
  for (let k = 0; k < n; k++) {
    const w = weight === null ? 1 : weight[k];
    if (w > 0) sum += w * pow(value[k] / mean, 1 - aversion);
  }
  return 1 - pow(sum / total, 1 / (1 - aversion));
}

/** One Theil measure split by classes: total = within + between. */
export interface TheilSplit {
  readonly within: number;
  readonly between: number;
  /** The measure inside each class, in the order of `levels`; NaN for a class without wealth. */
  readonly byGroup: Float64Array;
  readonly levels: readonly (string | number)[];
}

/**
 * Theil T by classes: within = Σ s_g T_g, between = Σ s_g ln(μ_g/μ), s_g the class's share of the total.
 *
 * @param labels - class of each row, in the order of the original values (rows left out included)
 * @returns parts that sum to `theilT` up to rounding. Cost O(n) after the sort.
 */
export function theilTSplit(values: Values, labels: ArrayLike<string | number>, weighting?: Weighting): TheilSplit {
  return split(values, labels, weighting, true);
}

/** Theil L by classes: within = Σ p_g L_g, between = Σ p_g ln(μ/μ_g), p_g the class's share of the population. */
export function theilLSplit(values: Values, labels: ArrayLike<string | number>, weighting?: Weighting): TheilSplit {
  return split(values, labels, weighting, false);
}

function split(
  values: Values,
  labels: ArrayLike<string | number>,
  weighting: Weighting | undefined,
  wealthShares: boolean,
): TheilSplit {
  const sample = sampleOf(values, weighting);
  const { n, value, weight, order, total, sum } = sample;
  const { of, count, levels } = groupingOf(labels, isSample(values) ? labels.length : values.length);
  const { size, held } = classTotals(sample, of, count);
  const byGroup = new Float64Array(count);
  for (let k = 0; k < n; k++) {
    const g = of[order[k]];
    const w = weight === null ? 1 : weight[k];
    if (w === 0) continue;
    const r = (value[k] * size[g]) / held[g];
    byGroup[g] += w * (wealthShares ? (r > 0 ? r * log(r) - (r - 1) : r === 0 ? 1 : NaN) : r - 1 - log(r));
  }
  let within = 0;
  for (let g = 0; g < count; g++) {
    byGroup[g] = held[g] > 0 ? byGroup[g] / size[g] : NaN;
    const share = wealthShares ? held[g] / sum : size[g] / total;
    if (share > 0) within += share * byGroup[g];
  }
  const between = wealthShares ? betweenT(size, held, total, sum) : betweenL(size, held, total, sum);
  return { within, between, byGroup, levels };
}

function classTotals(sample: Sample, of: ArrayLike<number>, count: number): { size: Float64Array; held: Float64Array } {
  const { n, value, weight, order } = sample;
  const size = new Float64Array(count);
  const held = new Float64Array(count);
  for (let k = 0; k < n; k++) {
    const g = of[order[k]];
    const w = weight === null ? 1 : weight[k];
    size[g] += w;
    held[g] += w * value[k];
  }
  return { size, held };
}

function betweenT(size: Float64Array, held: Float64Array, total: number, sum: number): number {
  let between = 0;
  for (let g = 0; g < size.length; g++) {
    if (size[g] === 0) continue;
    const r = (held[g] * total) / (size[g] * sum);
    between += (size[g] / total) * (r > 0 ? r * log(r) - (r - 1) : 1);
  }
  return between;
}

function betweenL(size: Float64Array, held: Float64Array, total: number, sum: number): number {
  let between = 0;
  for (let g = 0; g < size.length; g++) {
    if (size[g] === 0) continue;
    const r = (held[g] * total) / (size[g] * sum);
    between += (size[g] / total) * (r - 1 - log(r));
  }
  return between;
}

/**
 * The between part of Theil T alone, for classes that are numbered already.
 *
 * @param value - length n, ≥ 0, any order
 * @param of - class of each row, 0 … count−1, length n
 * @returns Σ s_g ln(μ_g/μ) ≥ 0. Cost O(n), no sort.
 */
export function theilTBetween(value: ArrayLike<number>, of: ArrayLike<number>, count: number): number {
  const n = value.length;
  const size = new Float64Array(count);
  const held = new Float64Array(count);
  let sum = 0;
  for (let i = 0; i < n; i++) {
    size[of[i]]++;
    held[of[i]] += value[i];
  }
  for (let g = 0; g < count; g++) sum += held[g];
  return sum > 0 ? betweenT(size, held, n, sum) : NaN;
}
