/**
 * Pockets of one arm and replicate, generation by generation: found, tested, followed.
 *
 * Puts cores.ts, pockets.ts, pocket-null.ts and life-lines.ts together and keeps what they need to remember: spells
 * of frustration and the pockets before.
 */
import type { Ties, Uniform } from '../../network/graph.js';
import { coresOf, frustratedTiesNeeded, lengthenSpells } from './cores.js';
import { LifeLines, type PocketEvent } from './life-lines.js';
import { PermutationPlan } from './permutations.js';
import { pocketTest } from './pocket-null.js';
import { type PocketRule, type PocketSet, pocketsOf } from './pockets.js';

/** A row of `pockets.csv` without arm, replicate and generation. */
export interface PocketRow {
  /** Stable id within arm and replicate. */
  readonly pocket: number;
  /** Core households; 0 in the row that tells of a pocket's end. */
  readonly size: number;
  readonly fringe: number;
  /** Places its core households live in. */
  readonly places: number;
  /** Mean wealth of its core households; NaN in the row of its end. */
  readonly meanWealth: number;
  /** Share of permutations whose largest pocket is at least as large; NaN in the row of its end. */
  readonly pValue: number;
  readonly event: PocketEvent;
  /** See `PocketEvent`; null for none. */
  readonly parent: number | null;
  /** Core households whose cause is local (frustrated by their own reference only); NaN until causes are given. */
  readonly local: number;
  /** Core households whose cause is general. */
  readonly general: number;
}

/** The pockets of one generation. Arrays are made anew each time. */
export interface PocketCensus {
  readonly rows: readonly PocketRow[];
  /** Id of each household's pocket, core or fringe, or −1. */
  readonly pocket: Int32Array;
  /** 0 none, 1 core, 2 fringe: see `ROLES` in pockets.ts. */
  readonly role: Uint8Array;
  /** Pockets alive now. */
  readonly pockets: number;
  /** Pockets with p ≤ 0.05. */
  readonly significant: number;
  /** Households that are core members of a pocket, share of all. */
  readonly pocketShare: number;
  /** Core households, in a pocket or not, share of all. */
  readonly coreShare: number;
  /** p-value of the share of core households; NaN when nobody has been frustrated for long enough. */
  readonly pValue: number;
}

/** Level at which a pocket counts as more than chance in `significant`. */
export const SIGNIFICANT = 0.05;

/** What a generation shows the tracker. */
export interface PocketInput {
  readonly frustrated: Uint8Array;
  readonly wealth: Float64Array;
  readonly place: Uint32Array;
  /** Ties of the generation; the same object while they do not change. */
  readonly ties: Ties;
  /** Cause of each household's frustration (cause.ts), when it has been worked out; codes as there. */
  readonly cause?: Uint8Array | null | undefined;
}

/** Follows the pockets of one arm and replicate. Call `generation` for t = 0, 1, … in order. */
export class PocketTracker {
  readonly rule: PocketRule;
  readonly plan: PermutationPlan;
  readonly #spell: Uint16Array;
  readonly #lines: LifeLines;
  #ties: Ties | undefined;
  #needed: Uint32Array = new Uint32Array(0);

  /**
   * @param plan - permutations, from `pocketPlan`; arms of a replicate may share one
   */
  constructor(rule: PocketRule, plan: PermutationPlan) {
    this.rule = rule;
    this.plan = plan;
    this.#spell = new Uint16Array(plan.n);
    this.#lines = new LifeLines(plan.n);
  }

  /** Generations on end that each household has been frustrated, as of the last generation seen. Not a copy. */
  get spell(): Uint16Array {
    return this.#spell;
  }

  generation(input: PocketInput): PocketCensus {
    const { frustrated, ties } = input;
    const { n } = this.plan;
    lengthenSpells(frustrated, this.#spell);
    const long = new Uint8Array(n);
    let longCount = 0;
    for (let i = 0; i < n; i++) {
      if (this.#spell[i] >= this.rule.minSpell && frustrated[i] === 1) {
        long[i] = 1;
        longCount++;
      }
    }
    if (ties !== this.#ties) {
      this.#ties = ties;
      this.#needed = frustratedTiesNeeded(ties, this.rule.coreShare);
    }
    const core = coresOf(ties, frustrated, long, this.#needed);
    let cores = 0;
    for (let i = 0; i < n; i++) cores += core[i];
    const set = pocketsOf(ties, core, frustrated, this.rule.minSize);
    const tested =
      longCount === 0 || this.rule.permutations === 0
        ? { sizeP: new Float64Array(set.count).fill(NaN), coreP: NaN }
        : cores === 0
          ? { sizeP: new Float64Array(0), coreP: 1 }
          : pocketTest(ties, frustrated, long, this.#needed, set.size, cores, this.plan);
    return this.#census(set, tested.sizeP, tested.coreP, cores / n, input);
  }

  #census(set: PocketSet, p: Float64Array, coreP: number, coreShare: number, input: PocketInput): PocketCensus {
    const { n } = this.plan;
    const { wealth, place, cause } = input;
    const steps = this.#lines.follow(set);
    const held = new Float64Array(set.count);
    const local = new Float64Array(set.count).fill(cause ? 0 : NaN);
    const general = new Float64Array(set.count).fill(cause ? 0 : NaN);
    const placesOf = Array.from({ length: set.count }, () => new Set<number>());
    const ids = new Int32Array(set.count);
    for (const { id, index } of steps) if (index >= 0) ids[index] = id;
    const pocket = new Int32Array(n);
    let members = 0;
    for (let i = 0; i < n; i++) {
      const k = set.pocket[i];
      pocket[i] = k < 0 ? -1 : ids[k];
      if (set.role[i] !== 1) continue;
      members++;
      held[k] += wealth[i];
      placesOf[k].add(place[i]);
      if (cause) {
        if (cause[i] === 1) local[k]++;
        else if (cause[i] === 2) general[k]++;
      }
    }
    const rows = steps.map(
      ({ id, index: k, event, parent }): PocketRow =>
        k < 0
          ? {
              pocket: id,
              size: 0,
              fringe: 0,
              places: 0,
              meanWealth: NaN,
              pValue: NaN,
              event,
              parent,
              local: NaN,
              general: NaN,
            }
          : {
              pocket: id,
              size: set.size[k],
              fringe: set.fringe[k],
              places: placesOf[k].size,
              meanWealth: held[k] / set.size[k],
              pValue: p[k],
              event,
              parent,
              local: local[k],
              general: general[k],
            },
    );
    let significant = 0;
    for (let k = 0; k < set.count; k++) if (p[k] <= SIGNIFICANT) significant++;
    return {
      rows,
      pocket,
      role: set.role,
      pockets: set.count,
      significant,
      pocketShare: members / n,
      coreShare,
      pValue: coreP,
    };
  }
}

/** Entries of permutations that a test of pockets may take a generation. */
const MOST_ENTRIES = 20_000_000;
/** Fewest permutations with which p ≤ 0.05 can still be told (1/40 is the smallest p). */
const FEWEST = 39;

/**
 * Permutations used for n households: what the rule asks for up to 100,000 households at 199, fewer beyond, so that
 * the test stays within about the time of a generation. A p-value from R permutations has standard error
 * √(p (1 − p) / R): at a million households R is 39, and 0.05 is known to ± 0.035.
 */
export function permutationsFor(n: number, asked: number): number {
  return Math.min(asked, Math.max(FEWEST, Math.floor(MOST_ENTRIES / n)));
}

/** The permutations a rule asks for (see `permutationsFor`), over everyone or within places. */
export function pocketPlan(rule: PocketRule, place: Uint32Array, uniform: Uniform): PermutationPlan {
  const n = place.length;
  return new PermutationPlan(n, permutationsFor(n, rule.permutations), uniform, rule.null === 'place' ? place : null);
}
