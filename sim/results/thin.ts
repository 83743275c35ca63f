/**
 * Which rows of the panel a study keeps: all, none, or some replicates, generations and households.
 *
 * Replicates are the first ones. Generations are 0, k, 2k … Households are spread evenly over their numbers, so
 * that a thinned panel has all places and groups in their shares; the same ones in every generation and arm.
 */

/** `keep.panel` of the study file; a part left out keeps everything. */
export type KeepPanel =
  | 'all'
  | 'none'
  | {
      readonly replicates?: number | undefined;
      readonly every?: number | undefined;
      readonly households?: number | undefined;
    };

/** True when any row of the replicate is kept. */
export function keepsReplicate(keep: KeepPanel, replicate: number): boolean {
  if (keep === 'all') return true;
  return keep !== 'none' && (keep.replicates === undefined || replicate < keep.replicates);
}

/** True when the generation is kept. */
export function keepsGeneration(keep: KeepPanel, generation: number): boolean {
  if (keep === 'all') return true;
  return keep !== 'none' && (keep.every === undefined || generation % keep.every === 0);
}

/** Households kept, ascending, or null for all of n. */
export function keptHouseholds(keep: KeepPanel, n: number): Uint32Array | null {
  if (keep === 'all' || keep === 'none' || keep.households === undefined || keep.households >= n) return null;
  const h = keep.households;
  // household k of h stands in the middle of the k-th of h equal stretches
  return Uint32Array.from({ length: h }, (_, k) => Math.floor(((k + 0.5) * n) / h));
}
