/**
 * What becomes of pockets from one generation to the next: born, growing, merging, splitting, dissolving.
 *
 * Pockets are followed by the core households they share. Ids are given once, counted up from 0 in each arm and
 * replicate, and never used again. Knows nothing of ties or significance.
 */
import type { PocketSet } from './pockets.js';

/** Overlap (Jaccard: shared members over all members of both) from which a pocket counts as the same one. */
export const SAME_POCKET = 0.3;
/** Share of a pocket's members in another from which it counts as having gone into it, or come out of it. */
export const MOST_MEMBERS = 0.5;

/**
 * What happened to a pocket.
 *
 * `born`: none of its kind before. `holds`, `grows`, `shrinks`: the same pocket with as many, more, fewer core
 * households. `merges`: the same pocket, and it took in at least half of another. `splits`: a new pocket, at least
 * half of it out of one `parent`. `dissolves`: gone. `absorbed`: gone, at least half of it into `parent`.
 */
export type PocketEvent = 'born' | 'holds' | 'grows' | 'shrinks' | 'merges' | 'splits' | 'dissolves' | 'absorbed';

/** One pocket in one generation of its life. */
export interface PocketStep {
  /** Stable id. */
  readonly id: number;
  /** Number of the pocket in the `PocketSet`, or −1 for one that has gone. */
  readonly index: number;
  readonly event: PocketEvent;
  /** `splits`: id it came out of; `absorbed`: id it went into; else null. */
  readonly parent: number | null;
}

/** Follows the pockets of one arm and replicate through the generations. */
export class LifeLines {
  #next = 0;
  /** Id of each core household's pocket in the generation before, or −1. */
  readonly #before: Int32Array;
  /** Core households of each living pocket in the generation before, by id. */
  #sizes = new Map<number, number>();

  constructor(n: number) {
    this.#before = new Int32Array(n).fill(-1);
  }

  /**
   * Takes in the next generation.
   *
   * @returns a step for each pocket of the set, in its order, then one for each that has gone, by id. Cost O(n).
   */
  follow(set: PocketSet): PocketStep[] {
    const { count, size, pocket, role } = set;
    const before = this.#before;
    const shared = Array.from({ length: count }, () => new Map<number, number>());
    for (let i = 0; i < before.length; i++) {
      if (role[i] !== 1 || before[i] < 0) continue;
      const counts = shared[pocket[i]];
      counts.set(before[i], (counts.get(before[i]) ?? 0) + 1);
    }
    const { idOf, takenBy } = this.#matches(size, shared);
    const absorbedBy = new Map<number, number>();
    const steps: PocketStep[] = [];
    const ids = new Int32Array(count);
    for (let k = 0; k < count; k++) {
      const id = idOf[k];
      if (id >= 0) {
        ids[k] = id;
        const was = this.#sizes.get(id) as number;
        let merged = false;
        for (const [other, members] of shared[k]) {
          if (takenBy.has(other) || members < MOST_MEMBERS * (this.#sizes.get(other) as number)) continue;
          absorbedBy.set(other, id);
          merged = true;
        }
        const change = size[k] > was ? 'grows' : size[k] < was ? 'shrinks' : 'holds';
        steps.push({ id, index: k, event: merged ? 'merges' : change, parent: null });
        continue;
      }
      ids[k] = this.#next++;
      let parent: number | null = null;
      let most = 0;
      for (const [other, members] of shared[k]) {
        if (members > most && members >= MOST_MEMBERS * size[k]) {
          parent = other;
          most = members;
        }
      }
      steps.push({ id: ids[k], index: k, event: parent === null ? 'born' : 'splits', parent });
    }
    const gone = [...this.#sizes.keys()].filter((id) => !takenBy.has(id)).sort((a, b) => a - b);
    for (const id of gone) {
      const into = absorbedBy.get(id);
      steps.push({ id, index: -1, event: into === undefined ? 'dissolves' : 'absorbed', parent: into ?? null });
    }
    this.#sizes = new Map(Array.from(ids, (id, k) => [id, size[k]]));
    for (let i = 0; i < before.length; i++) before[i] = role[i] === 1 ? ids[pocket[i]] : -1;
    return steps;
  }

  /** Pairs pockets with those before, best overlap first, each at most once. */
  #matches(
    size: Uint32Array,
    shared: readonly ReadonlyMap<number, number>[],
  ): { idOf: Int32Array; takenBy: Map<number, number> } {
    const pairs: { k: number; id: number; overlap: number }[] = [];
    shared.forEach((counts, k) => {
      for (const [id, members] of counts) {
        const overlap = members / (size[k] + (this.#sizes.get(id) as number) - members);
        if (overlap >= SAME_POCKET) pairs.push({ k, id, overlap });
      }
    });
    pairs.sort((a, b) => b.overlap - a.overlap || a.id - b.id || a.k - b.k);
    const idOf = new Int32Array(size.length).fill(-1);
    const takenBy = new Map<number, number>();
    for (const { k, id } of pairs) {
      if (idOf[k] >= 0 || takenBy.has(id)) continue;
      idOf[k] = id;
      takenBy.set(id, k);
    }
    return { idOf, takenBy };
  }
}
