/**
 * Preferential attachment (Barabási and Albert 1999): newcomers tie themselves to households in proportion to the
 * ties these already have, which gives a few households very many ties.
 *
 * Starts from a star of the first ties + 1 households. Households arrive in random order, so that ties have nothing
 * to do with wealth, place or group.
 */
import type { Labels, Ties, Uniform } from '../graph.js';
import { shuffled } from './order.js';
import { PairList } from './pair-list.js';
import { infeasible } from './refuse.js';
import type { PreferentialSpec } from './spec.js';

/**
 * @param spec - `ties` of each newcomer, a whole number from 1 to n−1; the mean degree is close to twice that
 * @param labels - only the number of households is used
 * @returns ties, exactly ties · (n − ties). Cost O(m) expected.
 * @throws InputError `network-infeasible` for a number of ties that is not whole, below 1, or too large
 */
export function preferential(spec: PreferentialSpec, labels: Labels, uniform: Uniform): Ties {
  const { n } = labels;
  const k = spec.ties;
  if (!(Number.isInteger(k) && k >= 1 && k <= n - 1)) {
    throw infeasible('ties', `${k} ties a newcomer among ${n} households`, `give a whole number from 1 to ${n - 1}`);
  }
  const arrival = shuffled(n, uniform);
  const m = k * (n - k);
  const out = new PairList(m);
  // every tie end once: a draw from this list is a draw in proportion to degree
  const ends = new Uint32Array(2 * m);
  let filled = 0;
  for (let a = 1; a <= k; a++) {
    out.push(arrival[0], arrival[a]);
    ends[filled++] = 0;
    ends[filled++] = a;
  }
  const chosen = new Uint32Array(k);
  const chosenBy = new Uint32Array(n);
  for (let a = k + 1; a < n; a++) {
    for (let c = 0; c < k; c++) {
      let b = ends[Math.floor(uniform() * filled)];
      while (chosenBy[b] === a) b = ends[Math.floor(uniform() * filled)];
      chosenBy[b] = a;
      chosen[c] = b;
    }
    for (let c = 0; c < k; c++) {
      out.push(arrival[a], arrival[chosen[c]]);
      ends[filled++] = a;
      ends[filled++] = chosen[c];
    }
  }
  return out.toTies(n);
}
