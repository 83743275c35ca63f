/**
 * Core households: long frustrated, with frustrated company.
 *
 * Core means frustrated for at least `minSpell` generations on end, this one included, and at least `coreShare` of
 * its ties to frustrated households. A household without ties is never core.
 */
import type { Ties } from '../../network/graph.js';

/**
 * Adds a generation to every household's spell of frustration.
 *
 * @param frustrated - 0 or 1, length n
 * @param spell - generations on end that end with this one, length n; updated in place (0 where not frustrated)
 */
export function lengthenSpells(frustrated: Uint8Array, spell: Uint16Array): void {
  for (let i = 0; i < spell.length; i++) spell[i] = frustrated[i] === 1 ? Math.min(65535, spell[i] + 1) : 0;
}

/**
 * Frustrated ties that make a household's company frustrated: the smallest whole number ≥ coreShare · degree.
 *
 * @returns by household; more than its degree where there are no ties
 */
export function frustratedTiesNeeded(ties: Ties, coreShare: number): Uint32Array {
  const needed = new Uint32Array(ties.n);
  for (let i = 0; i < ties.n; i++) {
    const degree = ties.start[i + 1] - ties.start[i];
    // a hair less, so that 0.3 · 10 needs 3 and not 4
    needed[i] = degree === 0 ? 1 : Math.ceil(coreShare * degree - 1e-9);
  }
  return needed;
}

/**
 * Marks the core households.
 *
 * @param long - 1 where frustrated for long enough
 * @param needed - from `frustratedTiesNeeded`
 * @returns 0 or 1 by household. Cost O(ties of long-frustrated households).
 */
export function coresOf(ties: Ties, frustrated: Uint8Array, long: Uint8Array, needed: Uint32Array): Uint8Array {
  const { n, start, target } = ties;
  const core = new Uint8Array(n);
  for (let i = 0; i < n; i++) {
    if (long[i] === 0) continue;
    let company = 0;
    for (let e = start[i]; e < start[i + 1]; e++) company += frustrated[target[e]];
    if (company >= needed[i]) core[i] = 1;
  }
  return core;
}
