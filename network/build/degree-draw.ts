/**
 * Numbers of ties drawn from a distribution, one a household.
 */
import { exp, log } from '../elementary.js';
import type { Uniform } from '../graph.js';

/**
 * Poisson degrees. Products of uniforms (Knuth), in pieces of mean at most 30 so that exp does not underflow.
 * Cost O(mean) a draw.
 */
export function poissonDegrees(n: number, mean: number, uniform: Uniform): Uint32Array {
  const out = new Uint32Array(n);
  const pieces = Math.max(1, Math.ceil(mean / 30));
  const limit = exp(-mean / pieces);
  for (let i = 0; i < n; i++) {
    let k = 0;
    for (let p = 0; p < pieces; p++) {
      let product = uniform();
      while (product > limit) {
        k++;
        product *= uniform();
      }
    }
    out[i] = Math.min(k, n - 1);
  }
  return out;
}

/**
 * Lognormal degrees of a given mean, rounded up or down at random so that the mean is kept; at most n − 1.
 *
 * @param sdLog - standard deviation of the logarithm, ≥ 0
 */
export function lognormalDegrees(n: number, mean: number, sdLog: number, uniform: Uniform): Uint32Array {
  const out = new Uint32Array(n);
  let spare = NaN;
  for (let i = 0; i < n; i++) {
    let z = spare;
    if (Number.isNaN(z)) {
      // polar method (Marsaglia and Bray 1964): two normals from a point in the disc
      let u: number;
      let v: number;
      let s: number;
      do {
        u = 2 * uniform() - 1;
        v = 2 * uniform() - 1;
        s = u * u + v * v;
      } while (s >= 1 || s === 0);
      const scale = Math.sqrt((-2 * log(s)) / s);
      z = u * scale;
      spare = v * scale;
    } else {
      spare = NaN;
    }
    const x = mean * exp(sdLog * z - (sdLog * sdLog) / 2);
    out[i] = Math.min(Math.floor(x + uniform()), n - 1);
  }
  return out;
}
