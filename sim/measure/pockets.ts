/**
 * Pockets: connected sets of core households, their fringe, and who belongs to which.
 *
 * A pocket is a connected component of core households (cores.ts) with at least `minSize` of them. Whether it is more
 * than chance is asked in pocket-null.ts, what became of it in life-lines.ts.
 */
import type { Ties } from '../../network/graph.js';

/** How pockets are found and tested: the study's `pockets`. */
export interface PocketRule {
  /** Generations on end that a core household has been frustrated. */
  readonly minSpell: number;
  /** Share of its ties that are frustrated, at least. */
  readonly coreShare: number;
  /** Core households in a pocket, at least. */
  readonly minSize: number;
  /** Permutations of the test; fewer are used above 100,000 households (see `permutationsFor`). */
  readonly permutations: number;
  /** Who trades statuses in the test: everyone, or households of the same place. */
  readonly null: 'everyone' | 'place';
}

/** The default rule. */
export const POCKET_RULE: PocketRule = {
  minSpell: 2,
  coreShare: 0.5,
  minSize: 5,
  permutations: 199,
  null: 'everyone',
};

/** Roles of households: `ROLES[role]` is the panel's text. */
export const ROLES = ['', 'core', 'fringe'] as const;

/** The pockets of one generation. Pockets are numbered from 0 by size, largest first, then by lowest household. */
export interface PocketSet {
  /** Number of pockets. */
  readonly count: number;
  /** Core households of each pocket. */
  readonly size: Uint32Array;
  /** Frustrated neighbours of each pocket's core that are not core themselves. */
  readonly fringe: Uint32Array;
  /** Pocket of each household, core or fringe, or −1. Length n. */
  readonly pocket: Int32Array;
  /** 0 none, 1 core, 2 fringe (see `ROLES`). Length n. */
  readonly role: Uint8Array;
}

/**
 * Finds the pockets.
 *
 * A fringe household next to several pockets goes to the one it has most ties to (the larger one when equal).
 *
 * @param core - 0 or 1 by household
 * @param frustrated - 0 or 1 by household; core households are frustrated
 * @param minSize - core households in a pocket, at least
 * @returns the set. Cost O(n + ties of core and frustrated households).
 */
export function pocketsOf(ties: Ties, core: Uint8Array, frustrated: Uint8Array, minSize: number): PocketSet {
  const { n, start, target } = ties;
  const component = new Int32Array(n).fill(-1);
  const stack = new Uint32Array(n);
  const sizes: number[] = [];
  for (let i = 0; i < n; i++) {
    if (core[i] === 0 || component[i] >= 0) continue;
    const c = sizes.length;
    let size = 0;
    let top = 0;
    stack[top++] = i;
    component[i] = c;
    while (top > 0) {
      const h = stack[--top];
      size++;
      for (let e = start[h]; e < start[h + 1]; e++) {
        const j = target[e];
        if (core[j] === 0 || component[j] >= 0) continue;
        component[j] = c;
        stack[top++] = j;
      }
    }
    sizes.push(size);
  }
  // components were met in the order of their lowest household, and sort is stable
  const kept = sizes.map((_, c) => c).filter((c) => sizes[c] >= minSize);
  kept.sort((a, b) => sizes[b] - sizes[a]);
  const numberOf = new Int32Array(sizes.length).fill(-1);
  kept.forEach((c, k) => {
    numberOf[c] = k;
  });
  const pocket = new Int32Array(n).fill(-1);
  const role = new Uint8Array(n);
  for (let i = 0; i < n; i++) {
    if (component[i] < 0) continue;
    pocket[i] = numberOf[component[i]];
    if (pocket[i] >= 0) role[i] = 1;
  }
  const size = Uint32Array.from(kept, (c) => sizes[c]);
  const fringe = new Uint32Array(kept.length);
  if (kept.length > 0) {
    for (let i = 0; i < n; i++) {
      if (frustrated[i] === 0 || core[i] === 1) continue;
      const k = pocketWithMostTies(ties, i, role, pocket);
      if (k < 0) continue;
      pocket[i] = k;
      fringe[k]++;
    }
    // roles last: a fringe household must not make its neighbours fringe
    for (let i = 0; i < n; i++) if (pocket[i] >= 0 && role[i] === 0) role[i] = 2;
  }
  return { count: kept.length, size, fringe, pocket, role };
}

/** Pocket whose core household i has most ties to, the first of equals; −1 for none. */
function pocketWithMostTies(ties: Ties, i: number, role: Uint8Array, pocket: Int32Array): number {
  const { start, target } = ties;
  let best = -1;
  let bestTies = 0;
  for (let e = start[i]; e < start[i + 1]; e++) {
    const j = target[e];
    if (role[j] !== 1) continue;
    const k = pocket[j];
    if (k === best) continue;
    let count = 0;
    for (let f = start[i]; f < start[i + 1]; f++) if (role[target[f]] === 1 && pocket[target[f]] === k) count++;
    if (count > bestTies || (count === bestTies && k < best)) {
      best = k;
      bestTies = count;
    }
  }
  return best;
}
