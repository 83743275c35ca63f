/**
 * What a network kind may be asked for, with the keys of a study file.
 *
 * Plain interfaces: the study schema checks what a person wrote; the builders check only what needs the households.
 */

/** Stochastic block model over places and groups. */
export interface BlocksSpec {
  kind: 'blocks';
  /** Expected ties of a household. */
  mean_degree: number;
  /** Expected share of a household's ties that stay in its place, 0 … 1; left out: as if place did not matter. */
  within_place?: number | undefined;
  /** Expected share of the ties inside a place that join two of the same group; left out: as if group did not matter. */
  within_group?: number | undefined;
}

/** Ties more likely between households of similar wealth rank. */
export interface SimilaritySpec {
  kind: 'similarity';
  mean_degree: number;
  /** Share of ties that go to households of nearly the same wealth rank, 0 … 1. */
  strength: number;
}

/** Small world: a ring of near neighbours with some ties moved. */
export interface RingSpec {
  kind: 'ring';
  /** Ties of a household before any is moved; even. */
  degree: number;
  /** Probability that one end of a tie is moved to a random household, 0 … 1. */
  rewire: number;
  /** Who sits next to whom on the ring; left out: random. */
  order?: 'wealth' | 'random' | 'place' | undefined;
}

/** Every pair equally likely. */
export interface RandomSpec {
  kind: 'random';
  mean_degree: number;
}

/** Newcomers choose households in proportion to the ties these have. */
export interface PreferentialSpec {
  kind: 'preferential';
  /** Ties that each newcomer makes. */
  ties: number;
}

/** Nearby households are tied; places are laid out in the plane. */
export interface SpatialSpec {
  kind: 'spatial';
  mean_degree: number;
  /** Side of the square over which a place's households lie, as a share of the whole map's side, 0 … 1. */
  spread: number;
}

/** Where a household's number of ties comes from. */
export type DegreesSpec =
  | { kind: 'poisson'; mean: number }
  | { kind: 'lognormal'; mean: number; sd_log: number }
  | { kind: 'file'; path: string; column?: string | undefined };

/** Given degrees, matched at random, with places and groups as in blocks. */
export interface ConfigurationSpec {
  kind: 'configuration';
  degrees: DegreesSpec;
  within_place?: number | undefined;
  within_group?: number | undefined;
}

/** Small graphs and shapes of the literature, for tests and teaching. */
export interface NamedSpec {
  kind: 'named';
  name: string;
}

/** Ties read from a file; reading is the caller's part. */
export interface FileSpec {
  kind: 'file';
  path: string;
}

export type NetworkSpec =
  | BlocksSpec
  | SimilaritySpec
  | RingSpec
  | RandomSpec
  | PreferentialSpec
  | SpatialSpec
  | ConfigurationSpec
  | NamedSpec
  | FileSpec;
