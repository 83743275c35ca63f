/**
 * Statistics of wealth over a whole set (a place, a group, everyone) as seen by each of its members.
 *
 * Some are one number a set (mean, median, quantile, max); some depend on the member's own wealth (upward mean,
 * similarity mean) and are computed for every sorted value of the set at once. The set includes the member itself.
 */
import { exp, log } from '../../network/elementary.js';
import { chebyshevAt, chebyshevFit, chebyshevNode, TERMS } from './chebyshev.js';

/** Type-7 quantile (R's and numpy's default) of values[from … to−1], ascending and not empty. */
export function quantileOfSorted(values: Float64Array, from: number, to: number, q: number): number {
  const h = (to - from - 1) * q;
  const below = Math.floor(h);
  const at = from + below;
  if (at + 1 >= to) return values[to - 1];
  return values[at] + (h - below) * (values[at + 1] - values[at]);
}

/** First index in values[from … to−1], ascending, whose value is ≥ x. */
export function lowerBound(values: Float64Array, from: number, to: number, x: number): number {
  while (from < to) {
    const middle = (from + to) >>> 1;
    if (values[middle] < x) from = middle + 1;
    else to = middle;
  }
  return from;
}

/**
 * For every sorted value, the mean of the strictly larger ones; the value itself when there are none.
 *
 * @param values - ascending. Cost O(m); relative error a few units in the last place (compensated sums).
 */
export function upwardMeans(values: Float64Array, out: Float64Array): void {
  const m = values.length;
  let sum = 0;
  let lost = 0;
  let at = m - 1;
  while (at >= 0) {
    const value = values[at];
    const mean = at === m - 1 ? value : (sum + lost) / (m - 1 - at);
    const last = at;
    // equal values see the same people above them
    while (at >= 0 && values[at] === value) {
      out[at] = mean;
      at--;
    }
    for (let e = last; e > at; e--) {
      const t = sum + value;
      lost += sum >= value ? sum - t + value : value - t + sum;
      sum = t;
    }
  }
}

/** Terms of the series of exp in `similarityByBoxes`: (1.7)^24/24! < 1e−15. */
const ORDER = 24;

/**
 * For every sorted value y_i, Σ_j w_ij y_j / Σ_j w_ij with w_ij = exp(−(ln y_j − ln y_i)²/(2h²)).
 *
 * Pairs are summed directly inside the window beyond which they weigh below e^−45 of the member's own term, when that
 * takes few pairs; otherwise through boxes (below). Relative error below 1e−12 directly, below 1e−10 by boxes (tested).
 *
 * @param values - ascending, > 0
 * @param h - window in units of log wealth
 */
export function similarityMeans(values: Float64Array, h: number, out: Float64Array): void {
  const m = values.length;
  const logs = new Float64Array(m);
  for (let i = 0; i < m; i++) logs[i] = log(values[i]);
  // richer members count in proportion to wealth, so the window reaches further up: d − d²/(2h²) = −45
  const window = h * h + h * Math.sqrt(h * h + 90);
  let pairs = 0;
  let low = 0;
  for (let i = 0; i < m; i++) {
    while (logs[low] < logs[i] - window) low++;
    pairs += 2 * (i - low);
  }
  const boxes = Math.ceil((4 * (logs[m - 1] - logs[0])) / h) + 1;
  // a pair costs about one exp; a member by boxes about a tenth of 48 multiply-adds plus two series
  if (m > 256 && pairs > 60 * m + 4000 * boxes) similarityByBoxes(values, logs, h, window, boxes, out);
  else similarityByPairs(values, logs, h, window, out);
}

function similarityByPairs(
  values: Float64Array,
  logs: Float64Array,
  h: number,
  window: number,
  out: Float64Array,
): void {
  const m = values.length;
  const factor = -0.5 / (h * h);
  let low = 0;
  let high = 0;
  for (let i = 0; i < m; i++) {
    while (logs[low] < logs[i] - window) low++;
    while (high < m && logs[high] <= logs[i] + window) high++;
    let top = 0;
    let bottom = 0;
    for (let j = low; j < high; j++) {
      const d = logs[j] - logs[i];
      const w = exp(factor * d * d);
      top += w * values[j];
      bottom += w;
    }
    out[i] = top / bottom;
  }
}

/**
 * Members are gathered in boxes h/4 wide. With u and v the distances from a box's middle to a member and to the point of
 * evaluation, in h, exp(−(v−u)²/2) = e^(−v²/2)·e^(−u²/2)·e^(uv), and |uv| is small, so e^(uv) is a short series with
 * relative accuracy pair by pair. Sums are evaluated at Chebyshev nodes of panels h/2 wide and read off in between.
 */
function similarityByBoxes(
  values: Float64Array,
  logs: Float64Array,
  h: number,
  window: number,
  boxes: number,
  out: Float64Array,
): void {
  const m = values.length;
  const origin = logs[0];
  const weights = new Float64Array(boxes * ORDER);
  const wealths = new Float64Array(boxes * ORDER);
  for (let j = 0; j < m; j++) {
    const position = (4 * (logs[j] - origin)) / h;
    const box = position | 0;
    const u = 0.25 * (position - box - 0.5);
    let term = exp(-0.5 * u * u);
    const at = box * ORDER;
    for (let p = 0; p < ORDER; p++) {
      weights[at + p] += term;
      wealths[at + p] += term * values[j];
      term *= u / (p + 1);
    }
  }
  const top = new Float64Array(TERMS);
  const bottom = new Float64Array(TERMS);
  const topFit = new Float64Array(TERMS);
  const bottomFit = new Float64Array(TERMS);
  const reach = Math.ceil((4 * window) / h) + 1;
  let i = 0;
  while (i < m) {
    const panel = ((2 * (logs[i] - origin)) / h) | 0;
    const middle = origin + (panel + 0.5) * 0.5 * h;
    for (let node = 0; node < TERMS; node++) {
      const x = middle + 0.25 * h * chebyshevNode(node);
      let t = 0;
      let b = 0;
      const from = Math.max(0, 2 * panel - reach);
      const to = Math.min(boxes, 2 * panel + 2 + reach);
      for (let box = from; box < to; box++) {
        const v = (x - origin) / h - 0.25 * (box + 0.5);
        const at = box * ORDER;
        let sumT = 0;
        let sumB = 0;
        for (let p = ORDER - 1; p >= 0; p--) {
          sumT = sumT * v + wealths[at + p];
          sumB = sumB * v + weights[at + p];
        }
        const e = exp(-0.5 * v * v);
        t += e * sumT;
        b += e * sumB;
      }
      top[node] = t;
      bottom[node] = b;
    }
    chebyshevFit(top, topFit, 0);
    chebyshevFit(bottom, bottomFit, 0);
    while (i < m) {
      const position = (2 * (logs[i] - origin)) / h;
      if ((position | 0) !== panel) break;
      const u = 2 * (position - panel) - 1;
      out[i] = chebyshevAt(topFit, 0, u) / chebyshevAt(bottomFit, 0, u);
      i++;
    }
  }
}

/** Sum of values, compensated (Neumaier 1974): error a unit in the last place whatever the length. */
export function compensatedSum(values: Float64Array): number {
  let sum = 0;
  let lost = 0;
  for (let i = 0; i < values.length; i++) {
    const x = values[i];
    const t = sum + x;
    lost += sum >= x ? sum - t + x : x - t + sum;
    sum = t;
  }
  return sum + lost;
}
