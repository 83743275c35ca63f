/**
 * A first placement of a network in the plane from its ties alone: two vectors of its slowest mixing.
 *
 * The two leading non-trivial eigenvectors of the lazy random walk on the ties (Koren 2005, "Drawing graphs by
 * eigenvectors"), approached by power iteration: households that reach each other in few steps come to lie close.
 * Knows nothing of places or groups, so separation in the drawing is separation in the ties.
 */
import type { Ties, Uniform } from '../graph.js';

/** Rounds of power iteration: the vectors need not converge, the layout only a start that is not by label. */
const ROUNDS = 60;

/**
 * @param uniform - seeded stream for the start of the iteration
 * @returns x, y by household, length 2n, of spread about 1; households without ties get random positions.
 *   Cost O(60 · (n + m)).
 */
export function spectral(ties: Ties, uniform: Uniform): Float64Array<ArrayBuffer> {
  const { n, start } = ties;
  const root = new Float64Array(n);
  for (let i = 0; i < n; i++) root[i] = Math.sqrt(start[i + 1] - start[i]);
  // in the symmetric form D^−½ A D^−½ the trivial vector is √degree
  const trivial = root.slice();
  normalise(trivial);
  let first = randomVector(n, uniform);
  let second = randomVector(n, uniform);
  let scratch = new Float64Array(n);
  for (let round = 0; round < ROUNDS; round++) {
    scratch = step(ties, root, first, scratch);
    [first, scratch] = [scratch, first];
    deflate(first, trivial);
    normalise(first);
    scratch = step(ties, root, second, scratch);
    [second, scratch] = [scratch, second];
    deflate(second, trivial);
    deflate(second, first);
    normalise(second);
  }
  const out = new Float64Array(2 * n);
  const scale = Math.sqrt(n);
  // typical √degree, so that dividing by it leaves the spread near 1
  const typical = Math.sqrt(ties.target.length / Math.max(1, n));
  for (let i = 0; i < n; i++) {
    const own = root[i] > 0 ? typical / root[i] : 0;
    out[2 * i] = own > 0 ? first[i] * own * scale : 2 * uniform() - 1;
    out[2 * i + 1] = own > 0 ? second[i] * own * scale : 2 * uniform() - 1;
  }
  return out;
}

/** One step of the lazy walk: half stay, half move to a neighbour. */
function step(
  ties: Ties,
  root: Float64Array,
  from: Float64Array,
  to: Float64Array<ArrayBuffer>,
): Float64Array<ArrayBuffer> {
  const { n, start, target } = ties;
  for (let i = 0; i < n; i++) {
    let sum = 0;
    for (let e = start[i]; e < start[i + 1]; e++) sum += from[target[e]] / root[target[e]];
    to[i] = root[i] > 0 ? 0.5 * from[i] + (0.5 * sum) / root[i] : 0;
  }
  return to;
}

function randomVector(n: number, uniform: Uniform): Float64Array<ArrayBuffer> {
  const v = new Float64Array(n);
  for (let i = 0; i < n; i++) v[i] = uniform() - 0.5;
  return v;
}

function normalise(v: Float64Array): void {
  let square = 0;
  for (let i = 0; i < v.length; i++) square += v[i] * v[i];
  const scale = square > 0 ? 1 / Math.sqrt(square) : 0;
  for (let i = 0; i < v.length; i++) v[i] *= scale;
}

/** Takes the part along `axis` (of length 1) out of v. */
function deflate(v: Float64Array, axis: Float64Array): void {
  let along = 0;
  for (let i = 0; i < v.length; i++) along += v[i] * axis[i];
  for (let i = 0; i < v.length; i++) v[i] -= along * axis[i];
}
