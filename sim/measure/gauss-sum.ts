/**
 * Sums of Gaussians at many points in linear time: the density that a kernel estimate puts at every data point.
 *
 * The fast Gauss transform in one dimension (Greengard and Strain 1991): boxes one bandwidth wide, Hermite
 * expansions of the sources turned into Taylor expansions around the targets' boxes, TERMS terms each. Does not
 * choose the bandwidth.
 */
import { exp } from '../../network/elementary.js';

const TERMS = 14;
/** Boxes further apart than this are left out: exp(−7²/2) < 3e−11 of a peak. */
const REACH = 7;
const INV_SQRT_2PI = 0.3989422804014327;

let transfers: Float64Array | null = null;

/**
 * Matrices that turn the Hermite coefficients of a box into Taylor coefficients of the box m boxes above it:
 * entry [m][l][k] = (−1)^l h_(k+l)(D)/l!, D = m/√2, h_k the Hermite functions (−1)^k d^k/dD^k exp(−D²).
 */
function transferMatrices(): Float64Array {
  if (transfers !== null) return transfers;
  const made = new Float64Array((2 * REACH + 1) * TERMS * TERMS);
  const h = new Float64Array(2 * TERMS);
  for (let m = -REACH; m <= REACH; m++) {
    const d = m / Math.SQRT2;
    h[0] = exp(-d * d);
    h[1] = 2 * d * h[0];
    for (let k = 1; k + 1 < 2 * TERMS; k++) h[k + 1] = 2 * d * h[k] - 2 * k * h[k - 1];
    const base = (m + REACH) * TERMS * TERMS;
    let factor = 1;
    for (let l = 0; l < TERMS; l++) {
      if (l > 0) factor /= -l;
      for (let k = 0; k < TERMS; k++) made[base + l * TERMS + k] = factor * h[k + l];
    }
  }
  transfers = made;
  return made;
}

/**
 * Gaussian kernel density at the data points themselves, each point included in its own estimate.
 *
 *     f(y_i) = Σ_j w_j φ((y_i − y_j)/h) / (h Σ w)
 *
 * @param value - ascending, length n
 * @param weight - length n, or null for equal weights
 * @param bandwidth - h > 0, in the unit of the values
 * @returns length n, per unit of the values; error below 1e−9 of the density's peak. Cost O(n).
 */
export function densityAtPoints(value: Float64Array, weight: Float64Array | null, bandwidth: number): Float64Array {
  const n = value.length;
  const out = new Float64Array(n);
  if (n === 0) return out;
  if (!(bandwidth > 0)) throw new RangeError(`bandwidth must be above 0, got ${bandwidth}`);
  const scale = 1 / (Math.SQRT2 * bandwidth);
  const origin = value[0];
  // boxes that hold points, in ascending order
  const boxOf = new Uint32Array(n);
  const number = new Float64Array(n);
  let boxes = 0;
  for (let i = 0; i < n; i++) {
    const b = Math.floor((value[i] - origin) / bandwidth);
    if (boxes === 0 || number[boxes - 1] !== b) number[boxes++] = b;
    boxOf[i] = boxes - 1;
  }
  const hermite = new Float64Array(boxes * TERMS);
  let total = 0;
  for (let i = 0; i < n; i++) {
    const at = boxOf[i] * TERMS;
    const v = (value[i] - origin - (number[boxOf[i]] + 0.5) * bandwidth) * scale;
    let term = weight === null ? 1 : weight[i];
    total += term;
    hermite[at] += term;
    for (let k = 1; k < TERMS; k++) {
      term *= v / k;
      hermite[at + k] += term;
    }
  }
  const matrices = transferMatrices();
  const taylor = new Float64Array(boxes * TERMS);
  let first = 0;
  for (let b = 0; b < boxes; b++) {
    while (number[b] - number[first] > REACH) first++;
    for (let s = first; s < boxes; s++) {
      const m = number[b] - number[s];
      if (m < -REACH) break;
      const base = (m + REACH) * TERMS * TERMS;
      for (let l = 0; l < TERMS; l++) {
        let sum = 0;
        const row = base + l * TERMS;
        for (let k = 0; k < TERMS; k++) sum += matrices[row + k] * hermite[s * TERMS + k];
        taylor[b * TERMS + l] += sum;
      }
    }
  }
  const norm = INV_SQRT_2PI / (bandwidth * total);
  for (let i = 0; i < n; i++) {
    const at = boxOf[i] * TERMS;
    const u = (value[i] - origin - (number[boxOf[i]] + 0.5) * bandwidth) * scale;
    let sum = taylor[at + TERMS - 1];
    for (let l = TERMS - 2; l >= 0; l--) sum = sum * u + taylor[at + l];
    out[i] = sum * norm;
  }
  return out;
}
