/**
 * A sample put in order once, so that every measure of a distribution shares the sort.
 *
 * Each measure accepts plain numbers, with optional weights, or a `Sample` made here. Does not compute measures.
 */
import { ShapeError } from '../../network/errors.js';
import { orderOf } from './order.js';

/** Numbers in ascending order with what most measures need. Made by `sampleOf`. */
export interface Sample {
  /** Number of rows. */
  readonly n: number;
  /** Values, ascending, length n. */
  readonly value: Float64Array;
  /** Weight of each value (same order), or null when every row weighs 1. */
  readonly weight: Float64Array | null;
  /** Row of the original data that each value came from, length n. */
  readonly order: Uint32Array;
  /** Sum of weights (n without weights). */
  readonly total: number;
  /** Weighted sum of values. */
  readonly sum: number;
  /** sum / total; NaN for an empty sample. */
  readonly mean: number;
}

/** How a measure reads its data. */
export interface Weighting {
  /** Sampling weight of each row, ≥ 0, same length as the values. Weight 2 counts as two rows. */
  readonly weights?: ArrayLike<number> | undefined;
  /**
   * Leave out rows with a value of 0 or less, and retake totals and means over the rest: the usual reading of
   * the logarithmic measures on survey data. Default false: zeros take their limit, negatives give NaN.
   */
  readonly positiveOnly?: boolean | undefined;
}

/** Data for a measure: numbers in any order, or a sample already in order. */
export type Values = ArrayLike<number> | Sample;

/** True for a sample made by `sampleOf`. */
export function isSample(values: Values): values is Sample {
  return 'order' in values && 'value' in values;
}

/**
 * Orders data once.
 *
 * @param values - length n, finite, any order; or a sample, which is returned as it is (or its positive part)
 * @returns the sample. Cost O(n).
 * @throws {RangeError} if a value is not finite or a weight is negative or not finite
 * @throws {ShapeError} if weights do not have the length of values
 */
export function sampleOf(values: Values, { weights, positiveOnly }: Weighting = {}): Sample {
  if (isSample(values)) {
    if (weights !== undefined) throw new TypeError('weights belong into sampleOf, not beside a sample already made');
    return positiveOnly === true ? positivePart(values) : values;
  }
  const n = values.length;
  if (weights !== undefined && weights.length !== n)
    throw new ShapeError('weights', weights.length, n, 'one per value');
  const order = orderOf(values);
  const value = new Float64Array(n);
  for (let k = 0; k < n; k++) value[k] = values[order[k]] + 0;
  let weight: Float64Array | null = null;
  if (weights !== undefined) {
    weight = new Float64Array(n);
    for (let k = 0; k < n; k++) {
      const w = weights[order[k]];
      if (!(w >= 0 && w < Infinity)) throw new RangeError(`weight ${order[k]} is ${w}; weights are finite and >= 0`);
      weight[k] = w;
    }
  }
  const made = withTotals(value, weight, order);
  return positiveOnly === true ? positivePart(made) : made;
}

/** The rows with a value above 0, sharing memory with the sample given. */
export function positivePart(sample: Sample): Sample {
  if (sample.n === 0 || sample.value[0] > 0) return sample;
  let from = 0;
  while (from < sample.n && !(sample.value[from] > 0)) from++;
  const weight = sample.weight === null ? null : sample.weight.subarray(from);
  return withTotals(sample.value.subarray(from), weight, sample.order.subarray(from));
}

function withTotals(value: Float64Array, weight: Float64Array | null, order: Uint32Array): Sample {
  const n = value.length;
  const total = weight === null ? n : sumOf(weight);
  const sum = weight === null ? sumOf(value) : sumOfProducts(weight, value);
  return { n, value, weight, order, total, sum, mean: sum / total };
}

/** Terms added up in blocks before the blocks are added: keeps rounding near that of pairwise summation. */
const BLOCK = 256;

/** Sum in blocks, in the order given: relative error about (BLOCK + n/BLOCK) units for terms of one sign. */
export function sumOf(values: ArrayLike<number>): number {
  const n = values.length;
  let sum = 0;
  for (let from = 0; from < n; from += BLOCK) {
    const to = Math.min(n, from + BLOCK);
    let block = 0;
    for (let i = from; i < to; i++) block += values[i];
    sum += block;
  }
  return sum;
}

function sumOfProducts(a: Float64Array, b: Float64Array): number {
  const n = a.length;
  let sum = 0;
  for (let from = 0; from < n; from += BLOCK) {
    const to = Math.min(n, from + BLOCK);
    let block = 0;
    for (let i = from; i < to; i++) block += a[i] * b[i];
    sum += block;
  }
  return sum;
}

/** Rows sorted into named classes. */
export interface Grouping {
  /** Class of each row, 0 … count−1. */
  readonly of: Uint32Array;
  readonly count: number;
  /** Name of each class, ascending (numbers by size, text by code unit). */
  readonly levels: readonly (string | number)[];
}

/**
 * Numbers the classes of a label column.
 *
 * @param labels - one per row, numbers or text
 * @param n - rows expected
 * @throws {ShapeError} if labels do not have length n
 */
export function groupingOf(labels: ArrayLike<string | number>, n: number): Grouping {
  if (labels.length !== n) throw new ShapeError('labels', labels.length, n, 'one label per value');
  const seen = new Set<string | number>();
  for (let i = 0; i < n; i++) seen.add(labels[i]);
  const levels = [...seen].sort((a, b) =>
    typeof a === 'number' && typeof b === 'number' ? a - b : String(a) < String(b) ? -1 : 1,
  );
  const number = new Map<string | number, number>();
  for (let g = 0; g < levels.length; g++) number.set(levels[g], g);
  const of = new Uint32Array(n);
  for (let i = 0; i < n; i++) of[i] = number.get(labels[i]) as number;
  return { of, count: levels.length, levels };
}
