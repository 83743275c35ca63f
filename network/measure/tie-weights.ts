/**
 * The spatial weights matrix that autocorrelation measures use: ties as binary or row-standardised weights.
 *
 * Only who is tied to whom counts, not tie weights. Households without ties are left out beforehand (*common practice*:
 * with nobody to be compared with they carry no information), so n below counts tied households.
 */
import type { Ties } from '../graph.js';

/** `binary`: w_ij = 1 for a tie. `row`: w_ij = 1 / degree of i, so that each household's weights sum to 1. */
export type WeightStyle = 'binary' | 'row';

/** Sums of the weights that the moments of autocorrelation statistics need (Cliff and Ord 1981, p. 19). */
export interface WeightSums {
  /** Households with ties. */
  readonly n: number;
  /** Σ w_ij. */
  readonly s0: number;
  /** ½ Σ (w_ij + w_ji)². */
  readonly s1: number;
  /** Σ_i (Σ_j w_ij + Σ_j w_ji)². */
  readonly s2: number;
}

/** Cost O(n + m). */
export function weightSums(ties: Ties, style: WeightStyle): WeightSums {
  const { n, start, target } = ties;
  let tied = 0;
  let s0 = 0;
  let s1 = 0;
  let s2 = 0;
  for (let i = 0; i < n; i++) {
    const k = start[i + 1] - start[i];
    if (k === 0) continue;
    tied++;
    if (style === 'binary') {
      s0 += k;
      s1 += 2 * k;
      s2 += 4 * k * k;
      continue;
    }
    s0 += 1;
    let column = 0;
    for (let e = start[i]; e < start[i + 1]; e++) {
      const j = target[e];
      const back = 1 / (start[j + 1] - start[j]);
      column += back;
      s1 += 0.5 * (1 / k + back) * (1 / k + back);
    }
    s2 += (1 + column) * (1 + column);
  }
  return { n: tied, s0, s1, s2 };
}

/** Numbers of the households that have ties, ascending. */
export function tiedHouseholds(ties: Ties): Uint32Array<ArrayBuffer> {
  const { n, start } = ties;
  const out = new Uint32Array(n);
  let count = 0;
  for (let i = 0; i < n; i++) if (start[i + 1] > start[i]) out[count++] = i;
  return out.slice(0, count);
}
