/**
 * Means over those a household has ties to, and over the second circle (ties of its ties).
 *
 * Every tie counts the same unless a function says otherwise: tie weights enter the reference groups of the model, not
 * these means. A household with nobody in the circle has no mean (NaN).
 */
import { ShapeError } from '../errors.js';
import type { Ties } from '../graph.js';

/**
 * Mean of a value over each household's neighbours, values that are NaN left out.
 *
 * @param values - length n
 * @param out - overwritten, length n; must not share memory with `values`; NaN where no neighbour has a value
 * @returns `out`. Cost O(n + ties).
 * @throws {ShapeError} when a length is not n
 */
export function neighbourMeans(ties: Ties, values: ArrayLike<number>, out: Float64Array): Float64Array {
  const { n, start, target } = ties;
  if (values.length !== n) throw new ShapeError('values', values.length, n, 'one value per household');
  if (out.length !== n) throw new ShapeError('out', out.length, n, 'one value per household');
  for (let i = 0; i < n; i++) {
    let sum = 0;
    let count = 0;
    for (let e = start[i]; e < start[i + 1]; e++) {
      const v = values[target[e]];
      if (!Number.isNaN(v)) {
        sum += v;
        count++;
      }
    }
    out[i] = count > 0 ? sum / count : Number.NaN;
  }
  return out;
}

/**
 * Mean of a value over each household's neighbours, each counted by the weight of the tie.
 *
 * @param values - length n, without NaN
 * @param out - overwritten, length n; must not share memory with `values`; NaN where the weights sum to 0
 * @returns `out`. Cost O(n + ties).
 * @throws {ShapeError} when a length is not n
 */
export function weightedNeighbourMeans(ties: Ties, values: ArrayLike<number>, out: Float64Array): Float64Array {
  const { n, start, target, weight } = ties;
  if (weight === null) return neighbourMeans(ties, values, out);
  if (values.length !== n) throw new ShapeError('values', values.length, n, 'one value per household');
  if (out.length !== n) throw new ShapeError('out', out.length, n, 'one value per household');
  for (let i = 0; i < n; i++) {
    let sum = 0;
    let total = 0;
    for (let e = start[i]; e < start[i + 1]; e++) {
      sum += weight[e] * values[target[e]];
      total += weight[e];
    }
    out[i] = total > 0 ? sum / total : Number.NaN;
  }
  return out;
}

/**
 * Mean of a value over each household's second circle: the ties of its ties, itself and its own ties left out,
 * everyone counted once.
 *
 * @param values - length n, without NaN
 * @param out - overwritten, length n; must not share memory with `values`; NaN where the second circle is empty
 * @param seen - scratch, length n; any content
 * @returns `out`. Cost O(sum over ties of the degrees at their ends).
 * @throws {ShapeError} when a length is not n
 */
export function secondCircleMeans(
  ties: Ties,
  values: ArrayLike<number>,
  out: Float64Array,
  seen: Uint32Array = new Uint32Array(ties.n),
): Float64Array {
  const { n, start, target } = ties;
  if (values.length !== n) throw new ShapeError('values', values.length, n, 'one value per household');
  if (out.length !== n) throw new ShapeError('out', out.length, n, 'one value per household');
  if (seen.length !== n) throw new ShapeError('seen', seen.length, n, 'one mark per household');
  seen.fill(0);
  for (let i = 0; i < n; i++) {
    const mark = i + 1;
    const from = start[i];
    const to = start[i + 1];
    seen[i] = mark;
    for (let e = from; e < to; e++) seen[target[e]] = mark;
    let sum = 0;
    let count = 0;
    for (let e = from; e < to; e++) {
      const j = target[e];
      for (let f = start[j]; f < start[j + 1]; f++) {
        const k = target[f];
        if (seen[k] === mark) continue;
        seen[k] = mark;
        sum += values[k];
        count++;
      }
    }
    out[i] = count > 0 ? sum / count : Number.NaN;
  }
  return out;
}
