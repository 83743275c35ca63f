/**
 * Seeded sequential streams for work that takes an unknown number of draws: drawing a graph, permutations.
 *
 * A stream is named by study seed, replicate and purpose, so adding draws to one purpose moves no other. Draws that
 * belong to a household come from draws.ts.
 */
import seedrandom from 'seedrandom';
import type { Uniform } from '../../network/graph.js';

/**
 * A uniform on [0, 1) with 32 random bits or more a call.
 *
 * @param seed - the study's seed; may hold any character, the parts are joined so that no two names coincide
 * @param purpose - what the draws are for, for instance `network segregated`
 */
export function stream(seed: string, replicate: number, purpose: string): Uniform {
  const generator = seedrandom(JSON.stringify([seed, replicate, purpose]));
  return () => generator();
}
