/**
 * What the engine is told: technology, shock, preferences and reference groups, in the units of the study.
 *
 * Plain data, no defaults: study/ reads files and fills in defaults; nothing here knows of files.
 */

/** How investment k becomes planned child wealth z. */
export type Technology =
  /** z = R·k; `grossReturn` = R, gross factor per generation. */
  | { readonly kind: 'linear'; readonly grossReturn: number }
  /** z = A·k^α + (1−d)·k. */
  | { readonly kind: 'concave'; readonly scale: number; readonly elasticity: number; readonly depreciation: number };

/** The luck that falls on child wealth: ln ε has standard deviation `sdLog`, E ε = 1. */
export interface Shock {
  /** s ≥ 0. */
  readonly sdLog: number;
  /** ω in [0, 1], the share of the log variance that is common to a place in a generation. */
  readonly sharedByPlace: number;
  /** `planned`: decides as if ε = 1; `expected`: maximises expected utility. */
  readonly risk: 'planned' | 'expected';
}

/** Preferences of one social group. */
export interface Preferences {
  /** σ > 0, CRRA curvature of u and v. */
  readonly curvature: number;
  /** δ > 0, median over households when `childWeightSpread` is positive. */
  readonly childWeight: number;
  readonly milestoneShape: 'threshold' | 'gain-loss';
  /** η in (0, 1), threshold shape. */
  readonly milestoneCurvature: number;
  /** λ ≥ 1, gain-loss shape. */
  readonly lossAversion: number;
}

/** One part of a reference mix: a statistic of wealth over a set of households. */
export interface Part {
  readonly from: 'self' | 'neighbours' | 'second_circle' | 'group' | 'place' | 'society';
  readonly statistic: 'mean' | 'median' | 'quantile' | 'upward_mean' | 'similarity_mean' | 'max';
  /** w ≥ 0; weights of a mix sum to 1. */
  readonly weight: number;
  /** q in [0, 1] for `quantile`. */
  readonly q: number;
  /** h > 0 for `similarity_mean`, in units of log wealth. */
  readonly window: number;
}

export interface Milestone {
  /** π ≥ 0. */
  readonly weight: number;
  /** Multiplies the mix. */
  readonly scale: number;
  readonly mix: readonly Part[];
}

/** Everything a generation needs besides households, ties and luck. */
export interface Model {
  readonly technology: Technology;
  readonly shock: Shock;
  /** By group index. */
  readonly preferences: readonly Preferences[];
  /** 1 to 4. */
  readonly milestones: readonly Milestone[];
  /** φ in [0, 1): weight of the inherited aspiration. */
  readonly persistence: number;
}

/** Labels of households, fixed for a replicate; all arrays of length n. */
export interface Households {
  readonly n: number;
  /** Place index, 0 … places − 1. */
  readonly place: Uint32Array;
  readonly places: number;
  /** Group index, 0 … groups − 1. */
  readonly group: Uint32Array;
  readonly groups: number;
  /** δ of each household, after group preferences and spread. */
  readonly childWeight: Float64Array;
}

/** One generation's columns, all of length n; made once and reused. */
export interface Generation {
  readonly wealth: Float64Array;
  /** One column a milestone. */
  readonly aspirations: readonly Float64Array[];
  readonly investment: Float64Array;
  readonly consumption: Float64Array;
  /** z, planned child wealth. */
  readonly planned: Float64Array;
  /** ε. */
  readonly shock: Float64Array;
  /** y' = z·ε. */
  readonly childWealth: Float64Array;
  /** Milestones met by the plan, 0 … M. */
  readonly met: Uint8Array;
  /** Milestones reached by child wealth after the shock, 0 … M. */
  readonly reached: Uint8Array;
  /** 1 when a part of a mix that needs ties fell back to own wealth. */
  readonly isolated: Uint8Array;
}
