/**
 * What a running study hands to whoever listens: measures, tables, a viewer.
 *
 * The loop (replicate.ts) owns the columns and overwrites them in the next generation: a listener copies what
 * it wants to keep. Knows nothing of files.
 */
import type { Labels, Ties } from '../../network/graph.js';
import type { Resolved } from '../model/generation.js';
import type { Generation, Households, Model } from '../model/types.js';

/** A covariate of the household file, one value a household. */
export interface Covariate {
  /** Column name in the file, `x_…`. */
  readonly name: string;
  /** Numbers (NaN = missing), or text (null = missing). */
  readonly values: Float64Array | readonly (string | null)[];
}

/** One arm of one replicate, before its first generation. */
export interface ArmRecord {
  readonly arm: string;
  readonly armIndex: number;
  readonly replicate: number;
  /** Decisions: t = 0 … generations − 1. */
  readonly generations: number;
  readonly households: Households;
  /** Labels for network measures; `wealth` is initial wealth. */
  readonly labels: Labels;
  readonly groupNames: readonly string[];
  /** Names of places as in the household file, or null when places are numbers. */
  readonly placeNames: readonly string[] | null;
  /** Ids of the household file in the order of its rows, or null when households are drawn. */
  readonly householdIds: readonly string[] | null;
  readonly covariates: readonly Covariate[];
  /** 1 when any change of the study ever acts on the household in this arm; null while no study has changes. */
  readonly treated: Uint8Array | null;
  readonly model: Model;
  /** Ties at generation 0, after that generation's changes. */
  readonly ties: Ties;
  /** What the network reached, by measure name, and what was asked. */
  readonly network: NetworkReport;
}

/** What was asked of an arm's network and what was reached. */
export interface NetworkReport {
  readonly kind: string;
  readonly asked: Readonly<Record<string, number | string | boolean | undefined>>;
  readonly reached: Readonly<Record<string, number>>;
  /** Swap mixing only. */
  readonly mixing?: {
    readonly target: string;
    readonly asked: number;
    readonly reached: number;
    readonly tried: number;
    readonly accepted: number;
    readonly outOfReach: boolean;
  };
}

/** One generation of one arm and replicate. */
export interface GenerationRecord {
  /** t = 0 … T; at T only `columns.wealth` holds (the final children), and `decided` is false. */
  readonly generation: number;
  readonly decided: boolean;
  readonly columns: Generation;
  /** Wealth of generation t − 1 by household; null at t = 0. */
  readonly parentWealth: Float64Array | null;
  readonly ties: Ties;
  /** What every household would do with the society-wide mean as its whole reference, all else equal; null at T. */
  readonly underSociety: (() => Resolved) | null;
  /** True when ties differ from the previous generation's (always true at t = 0). */
  readonly tiesChanged: boolean;
}

/** Listens to a replicate. Called in the order arm, generations 0 … T, end of arm. */
export interface Recorder {
  armStarts(record: ArmRecord): void;
  generation(record: GenerationRecord): void;
  armEnds(): void;
}
