/**
 * A network in one row of numbers, for tables and `network measure`.
 */
import { type Ties, tieCount, type Uniform } from '../graph.js';
import { assortativity, degreeAssortativity } from './assortativity.js';
import { components, degreeCounts } from './components.js';
import { coleman, externalInternal, groupAssortativity, groupTies, modularity } from './mixing-by-group.js';
import { moran, moranPermutation } from './moran.js';
import { clustering } from './triangles.js';

/** Keys as published; a number that is not defined on this network is null. */
export interface NetworkSummary {
  readonly households: number;
  readonly ties: number;
  readonly isolates: number;
  /** Connected components, an isolate being one. */
  readonly components: number;
  /** Households in the largest. */
  readonly largest_component: number;
  readonly mean_degree: number | null;
  readonly max_degree: number;
  /** Global: 3 × triangles / connected triples, 0 without triples. */
  readonly transitivity: number;
  /** Mean local clustering, degree below 2 counting as 0. */
  readonly average_clustering: number | null;
  readonly assortativity_degree: number | null;
  /** With a value column. */
  readonly assortativity_value?: number | null;
  /** Moran's I, row-standardised weights, isolates left out. */
  readonly moran?: number | null;
  readonly moran_expected?: number | null;
  /** Two-sided; over permutations, or normal under randomisation when none are asked for. */
  readonly moran_p?: number | null;
  /** With a grouping column. */
  readonly assortativity_group?: number | null;
  readonly modularity?: number | null;
  readonly e_i_group?: number | null;
  readonly coleman_group?: number | null;
}

export interface SummaryOptions {
  /** A number of each household; ones that are NaN are left out with their ties. */
  readonly value?: Float64Array | undefined;
  /** A label of each household, 0 … groups−1. */
  readonly by?: Uint32Array | undefined;
  /** Permutations for `moran_p`; 0 gives the normal p-value under randomisation. */
  readonly permutations: number;
  /** Seeded stream for the permutations. */
  readonly uniform: Uniform;
}

/**
 * Ties count alike, whatever their weights.
 *
 * @returns see {@link NetworkSummary}. Cost O(m √m) at worst, and permutations · (n + m) with a value.
 */
export function networkSummary(ties: Ties, options: SummaryOptions): NetworkSummary {
  const degree = degreeCounts(ties);
  const { sizes } = components(ties);
  const closed = clustering(ties);
  let largest = 0;
  for (const size of sizes) largest = Math.max(largest, size);
  const base: NetworkSummary = {
    households: ties.n,
    ties: tieCount(ties),
    isolates: degree.isolates,
    components: sizes.length,
    largest_component: largest,
    mean_degree: defined(degree.mean),
    max_degree: degree.max,
    transitivity: closed.transitivity,
    average_clustering: defined(closed.average),
    assortativity_degree: defined(degreeAssortativity(ties)),
  };
  return { ...base, ...valuePart(ties, options), ...groupPart(ties, options) };
}

function valuePart(ties: Ties, options: SummaryOptions): Partial<NetworkSummary> {
  const { value, permutations, uniform } = options;
  if (value === undefined) return {};
  const known = keep(ties, value);
  const i = moran(known.ties, known.value, 'row');
  const p = permutations > 0 ? moranPermutation(known.ties, known.value, 'row', permutations, uniform) : i.pRandom;
  return {
    assortativity_value: defined(assortativity(ties, value)),
    moran: defined(i.i),
    moran_expected: defined(i.expected),
    moran_p: defined(p),
  };
}

function groupPart(ties: Ties, options: SummaryOptions): Partial<NetworkSummary> {
  if (options.by === undefined) return {};
  const counts = groupTies(ties, options.by);
  return {
    assortativity_group: defined(groupAssortativity(counts)),
    modularity: defined(modularity(counts)),
    e_i_group: defined(externalInternal(counts)),
    coleman_group: defined(coleman(counts)),
  };
}

/** The network of the households whose value is known. */
function keep(ties: Ties, value: Float64Array): { ties: Ties; value: Float64Array } {
  if (!value.some(Number.isNaN)) return { ties, value };
  const number = new Int32Array(ties.n).fill(-1);
  const kept: number[] = [];
  for (let i = 0; i < ties.n; i++) if (!Number.isNaN(value[i])) number[i] = kept.push(i) - 1;
  const start = new Uint32Array(kept.length + 1);
  const target: number[] = [];
  kept.forEach((i, a) => {
    for (let e = ties.start[i]; e < ties.start[i + 1]; e++) {
      const b = number[ties.target[e]];
      if (b >= 0) target.push(b);
    }
    start[a + 1] = target.length;
  });
  return {
    ties: { n: kept.length, start, target: Uint32Array.from(target), weight: null },
    value: Float64Array.from(kept, (i) => value[i]),
  };
}

function defined(x: number): number | null {
  return Number.isFinite(x) ? x : null;
}
