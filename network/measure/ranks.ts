/**
 * Ranks of a value over households, ties averaged.
 */

/**
 * Mid-ranks scaled to 0 … 1: (average position − ½) / n, positions from 1; equal values share their average.
 * Cost O(n log n).
 */
export function midRanks(value: Float64Array): Float64Array {
  const n = value.length;
  const order = new Uint32Array(n);
  for (let i = 0; i < n; i++) order[i] = i;
  order.sort((i, j) => value[i] - value[j]);
  const out = new Float64Array(n);
  let from = 0;
  while (from < n) {
    let to = from + 1;
    while (to < n && value[order[to]] === value[order[from]]) to++;
    // positions from + 1 … to average to (from + to + 1) / 2
    const rank = (from + to) / 2 / n;
    for (let at = from; at < to; at++) out[order[at]] = rank;
    from = to;
  }
  return out;
}

/** Median: the middle value, or the mean of the two middle ones. NaN for none. Cost O(n log n). */
export function median(value: Float64Array): number {
  const n = value.length;
  if (n === 0) return NaN;
  const sorted = value.slice().sort();
  return n % 2 === 1 ? sorted[(n - 1) / 2] : (sorted[n / 2 - 1] + sorted[n / 2]) / 2;
}
