/**
 * What the two fields show at one moment: the same households in two arms, with everything drawing needs.
 */
import type { Ties } from '../../network/graph.js';
import type { Cast, Snapshot } from '../data/source.js';
import type { Arrangement, Axis } from './arrangement.js';
import type { Colouring } from './colouring.js';

/** A pocket to tint. */
export interface ShownPocket {
  readonly id: number;
  readonly members: readonly number[];
  /** NaN when the study did not test it. */
  readonly pValue: number;
}

/** One arm at the generation shown. */
export interface ArmScene {
  readonly name: string;
  /** Measures in words, under the name. */
  readonly note: string;
  readonly cast: Cast;
  readonly now: Snapshot;
  /** The generation before `now`, or null at the start. */
  readonly earlier: Snapshot | null;
  readonly ties: Ties;
  /** Sideways place in the ladder, 0 … 1, length n. */
  readonly sideways: Float32Array;
  /** Map positions, length 2 n, or null while they are computed or not asked for. */
  readonly map: Float32Array | null;
  /** Small print of the map, or null. */
  readonly print: string | null;
  /** Pockets that are more than chance. */
  readonly pockets: readonly ShownPocket[];
}

export interface Scene {
  readonly generation: number;
  readonly arms: readonly [ArmScene, ArmScene];
  readonly arrangement: Arrangement;
  readonly colouring: Colouring;
  readonly tiesShown: boolean;
  readonly axis: Axis;
  /** Index of the selected household in the cast, or −1. */
  readonly selected: number;
  /** Pocket picked out in each field, or −1. */
  readonly pocket: readonly [number, number];
  /** Ends of the ladder's sideways axis in words. */
  readonly sidewaysSays: string;
  readonly groupNames: readonly string[];
}

/** Weight of each household the selected one looks at: members richer than it count in an upward mean. */
export function looksUpTo(ties: Ties, wealth: Float64Array, i: number): { up: number[]; other: number[] } {
  const up: number[] = [];
  const other: number[] = [];
  for (let e = ties.start[i]; e < ties.start[i + 1]; e++) {
    const j = ties.target[e];
    (wealth[j] > wealth[i] ? up : other).push(j);
  }
  return { up, other };
}
