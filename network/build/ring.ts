/**
 * Small world (Watts and Strogatz 1998): a ring on which each household is tied to its nearest, with some ties moved.
 *
 * Each tie is visited once and with probability `rewire` its far end goes to a household drawn at random, loops and
 * second ties excluded; the near end stays. Clustering falls as (1 − rewire)³ (Barrat and Weigt 2000).
 */
import type { Labels, Ties, Uniform } from '../graph.js';
import { byWealth, cells, shuffled } from './order.js';
import { PairList } from './pair-list.js';
import { checkShare, infeasible } from './refuse.js';
import type { RingSpec } from './spec.js';

/**
 * @param spec - `degree` even, 0 … n−1; `rewire` 0 … 1; `order` of the households round the ring (default random)
 * @param labels - wealth or place give the order; within a place the order is random
 * @returns ties, exactly n · degree / 2 of them. Cost O(n + m), and a sort for `order: wealth`.
 * @throws InputError `network-infeasible` for an odd degree or too few households
 */
export function ring(spec: RingSpec, labels: Labels, uniform: Uniform): Ties {
  const { n } = labels;
  const half = spec.degree / 2;
  checkShare('rewire', spec.rewire);
  if (!(Number.isInteger(half) && half >= 0)) {
    throw infeasible(
      'degree',
      `a ring with ${spec.degree} ties each has no middle: half lie on either side`,
      'give an even number',
    );
  }
  if (n > 0 && spec.degree > n - 1) {
    throw infeasible('degree', `${spec.degree} ties for each of ${n} households`, 'lower it or add households');
  }
  const seat = seats(spec, labels, uniform);
  const m = n * half;
  const out = new PairList(m);
  const moved = new Uint8Array(m);
  // moved ties, as linked lists by household: a lattice tie is recognised by arithmetic and needs no list
  const head = new Int32Array(n).fill(-1);
  const next: number[] = [];
  const other: number[] = [];
  const lattice = (a: number, b: number): boolean => {
    const forward = b >= a ? b - a : b - a + n;
    const back = n - forward;
    return (
      (forward <= half && moved[a * half + forward - 1] === 0) || (back <= half && moved[b * half + back - 1] === 0)
    );
  };
  const joined = (a: number, b: number): boolean => {
    if (lattice(a, b)) return true;
    for (let l = head[a]; l >= 0; l = next[l]) if (other[l] === b) return true;
    return false;
  };
  const link = (a: number, b: number): void => {
    next.push(head[a]);
    other.push(b);
    head[a] = next.length - 1;
  };
  const degree = new Uint32Array(n).fill(spec.degree);
  // all nearest ties first, then all second-nearest, as in the original
  for (let step = 1; step <= half; step++) {
    for (let a = 0; a < n; a++) {
      if (!(uniform() < spec.rewire) || degree[a] >= n - 1) continue;
      let b = Math.floor(uniform() * n);
      while (b === a || joined(a, b)) b = Math.floor(uniform() * n);
      moved[a * half + step - 1] = 1;
      degree[(a + step) % n]--;
      degree[b]++;
      link(a, b);
      link(b, a);
      out.push(seat[a], seat[b]);
    }
  }
  for (let a = 0; a < n; a++) {
    for (let step = 1; step <= half; step++) {
      if (moved[a * half + step - 1] === 0) out.push(seat[a], seat[(a + step) % n]);
    }
  }
  return out.toTies(n);
}

/** The household on each seat of the ring. */
function seats(spec: RingSpec, labels: Labels, uniform: Uniform): Uint32Array {
  switch (spec.order ?? 'random') {
    case 'wealth':
      return byWealth(labels.wealth);
    case 'random':
      return shuffled(labels.n, uniform);
    case 'place': {
      const mixed = shuffled(labels.n, uniform);
      // the random order within a place: number households by a shuffle, then sort the places stably
      const place = mixed.map((i) => labels.place[i]);
      const sorted = cells({ ...labels, place, group: new Uint32Array(labels.n) }).members;
      return sorted.map((i) => mixed[i]);
    }
  }
}
