/**
 * Lives of pockets: one line for each pocket of an arm and replicate, from the rows of its generations.
 *
 * For answers and figures: where pockets arose, how large they grew, how long they lasted, what ended them.
 */
import type { PocketEvent } from './life-lines.js';

/** What a life is put together from: the columns of `pockets.csv` that it needs. */
export interface PocketRecord {
  readonly generation: number;
  readonly pocket: number;
  readonly size: number;
  readonly pValue: number;
  readonly event: PocketEvent;
  readonly parent: number | null;
}

/** One pocket from its first to its last generation. */
export interface PocketLife {
  readonly pocket: number;
  readonly firstGeneration: number;
  readonly lastGeneration: number;
  /** Generations in which it lived. */
  readonly generations: number;
  /** `born`, or `splits` out of `parent`. */
  readonly began: 'born' | 'splits';
  readonly parent: number | null;
  /** `dissolves`, `absorbed` into `into`, or `lasts` to the end of the horizon. */
  readonly ended: 'dissolves' | 'absorbed' | 'lasts';
  readonly into: number | null;
  readonly peakSize: number;
  /** Generation of the peak, the first when several. */
  readonly peakGeneration: number;
  /** Smallest p-value of its life; NaN when it was never tested. */
  readonly smallestP: number;
}

/**
 * Puts lives together.
 *
 * @param rows - rows of one arm and replicate, generations ascending
 * @returns a life for each pocket, by id
 */
export function pocketLives(rows: readonly PocketRecord[]): PocketLife[] {
  const lives = new Map<number, PocketLife>();
  for (const { generation, pocket, size, pValue, event, parent } of rows) {
    const life = lives.get(pocket);
    if (life === undefined) {
      lives.set(pocket, {
        pocket,
        firstGeneration: generation,
        lastGeneration: generation,
        generations: 1,
        began: event === 'splits' ? 'splits' : 'born',
        parent,
        ended: 'lasts',
        into: null,
        peakSize: size,
        peakGeneration: generation,
        smallestP: pValue,
      });
    } else if (event === 'dissolves' || event === 'absorbed') {
      lives.set(pocket, { ...life, ended: event, into: parent });
    } else {
      const higher = size > life.peakSize;
      lives.set(pocket, {
        ...life,
        lastGeneration: generation,
        generations: life.generations + 1,
        peakSize: higher ? size : life.peakSize,
        peakGeneration: higher ? generation : life.peakGeneration,
        smallestP: smaller(life.smallestP, pValue),
      });
    }
  }
  return [...lives.values()].sort((a, b) => a.pocket - b.pocket);
}

/** The smaller of two numbers, of which either may be missing. */
function smaller(a: number, b: number): number {
  if (Number.isNaN(a)) return b;
  return Number.isNaN(b) ? a : Math.min(a, b);
}
