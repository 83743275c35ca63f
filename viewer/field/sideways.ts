/**
 * Sideways places on the ladder until ties are known: a column a place, poorer to richer, households spread within.
 */
import type { Cast } from '../data/source.js';

/** @returns 0 … 1 by household */
export function sidewaysOf(cast: Cast, wealth: Float64Array): Float32Array {
  const { n, place, places } = cast;
  const sum = new Float64Array(places);
  const count = new Float64Array(places);
  for (let i = 0; i < n; i++) {
    sum[place[i]] += Math.log(Math.max(1e-9, wealth[i]));
    count[place[i]]++;
  }
  const order = Array.from({ length: places }, (_, p) => p).sort((p, q) => sum[p] / count[p] - sum[q] / count[q]);
  const left = new Float64Array(places);
  let at = 0;
  for (const p of order) {
    left[p] = at / n;
    at += count[p];
  }
  const out = new Float32Array(n);
  for (let i = 0; i < n; i++) {
    const p = place[i];
    const hash = (Math.imul(i + 1, 0x9e3779b1) >>> 0) / 4294967296;
    out[i] = left[p] + (0.12 + 0.76 * hash) * (count[p] / n);
  }
  return out;
}
