/**
 * The households of one replicate: places, groups, initial wealth, child weights.
 *
 * Drawn from (study seed, replicate) alone, so that all arms share them. Wealth is a latent normal per
 * household, part of it common to the place, read through the quantile function of the shape asked for; then
 * multiplied by the group's relative wealth and rescaled to the mean (files.md). Ties are networks.ts.
 */
import { exp, log, pow } from '../../network/elementary.js';
import type { Labels } from '../../network/graph.js';
import type { Draws } from '../random/draws.js';
import { normalCdf, normalQuantile } from '../random/normal.js';
import type { Study } from './complete.js';
import type { Inputs } from './inputs.js';
import type { Covariate } from './record.js';
import type { WealthFile } from './schema.js';

/** The households of a replicate, the same in every arm. */
export interface Population {
  readonly labels: Labels;
  readonly places: number;
  readonly groupNames: readonly string[];
  readonly placeNames: readonly string[] | null;
  readonly householdIds: readonly string[] | null;
  readonly covariates: readonly Covariate[];
  /** Standard normal draw of each household behind its child weight. */
  readonly tasteDraw: Float64Array;
}

/**
 * Draws the households of one replicate.
 *
 * @param inputs - files the study names, already read and checked
 * @returns wealth in the study's unit, all above 0
 */
export function drawPopulation(study: Study, inputs: Inputs, draws: Draws): Population {
  const file = inputs.households;
  if (file !== null) {
    const tasteDraw = new Float64Array(file.n);
    draws.normals('childWeight', 0, tasteDraw);
    return {
      labels: { n: file.n, place: file.place, group: file.group, wealth: file.wealth },
      places: file.placeNames.length,
      groupNames: file.groupNames,
      placeNames: file.placeNames,
      householdIds: file.ids,
      covariates: file.covariates,
      tasteDraw,
    };
  }
  const n = study.population.households!;
  const { count: places, size_cv: sizeCv } = study.population.places!;
  const groups = study.population.groups!;
  const place = drawPlaces(n, places, sizeCv, draws);
  const group = drawGroups(
    n,
    groups.map((g) => g.share ?? 1),
    draws,
  );
  const wealth = drawWealth(study.population.wealth!, inputs, place, places, draws);
  const relative = Float64Array.from(groups, (g) => g.relative_wealth ?? 1);
  const target = study.population.wealth!.mean ?? (relative.every((r) => r === 1) ? null : mean(wealth));
  for (let i = 0; i < n; i++) wealth[i] *= relative[group[i]];
  if (target !== null) {
    const factor = target / mean(wealth);
    for (let i = 0; i < n; i++) wealth[i] *= factor;
  }
  const tasteDraw = new Float64Array(n);
  draws.normals('childWeight', 0, tasteDraw);
  return {
    labels: { n, place, group, wealth },
    places,
    groupNames: groups.map((g) => g.name),
    placeNames: null,
    householdIds: null,
    covariates: [],
    tasteDraw,
  };
}

/** Place of each household: consecutive runs, of equal size or with lognormal sizes of the given coefficient of variation. */
function drawPlaces(n: number, places: number, sizeCv: number, draws: Draws): Uint32Array {
  const weight = new Float64Array(places).fill(1);
  if (sizeCv > 0) {
    const s = Math.sqrt(log(1 + sizeCv * sizeCv));
    draws.normals('placeLabel', 0, weight);
    for (let p = 0; p < places; p++) weight[p] = exp(s * weight[p]);
  }
  const sizes = apportion(n, weight);
  const place = new Uint32Array(n);
  let at = 0;
  for (let p = 0; p < places; p++) {
    place.fill(p, at, at + sizes[p]);
    at += sizes[p];
  }
  return place;
}

/** Group of each household: exact shares, in random order. */
function drawGroups(n: number, shares: readonly number[], draws: Draws): Uint32Array {
  const group = new Uint32Array(n);
  if (shares.length === 1) return group;
  const sizes = apportion(n, Float64Array.from(shares), 0);
  const u = new Float64Array(n);
  draws.uniforms('groupLabel', 0, u);
  const sorted = u.slice().sort();
  const cuts: number[] = [];
  let upTo = 0;
  for (let g = 0; g < shares.length - 1; g++) {
    upTo += sizes[g];
    cuts.push(upTo < n ? sorted[upTo] : Infinity);
  }
  for (let i = 0; i < n; i++) {
    let g = 0;
    while (g < cuts.length && u[i] >= cuts[g]!) g++;
    group[i] = g;
  }
  return group;
}

/** Whole numbers in proportion to weights, each at least `least`, summing to n (largest remainders). */
export function apportion(n: number, weight: Float64Array, least = 1): Uint32Array {
  const k = weight.length;
  let total = 0;
  for (let p = 0; p < k; p++) total += weight[p];
  const spare = n - least * k;
  const sizes = new Uint32Array(k);
  const remainder = new Float64Array(k);
  let given = 0;
  for (let p = 0; p < k; p++) {
    // the floor `least` is taken out of each one's own share, so equal weights stay equal
    const exact = Math.max(least, (n * weight[p]) / total);
    sizes[p] = Math.floor(exact + 1e-9);
    remainder[p] = exact - sizes[p];
    given += sizes[p];
  }
  const order = Array.from(remainder, (_, p) => p).sort((a, b) => remainder[b] - remainder[a] || a - b);
  for (let r = 0; given < n; r++) {
    sizes[order[r % k]!]!++;
    given++;
  }
  for (let r = k - 1; given > n && spare >= 0; r = r === 0 ? k - 1 : r - 1) {
    const p = order[r]!;
    if (sizes[p] > least) {
      sizes[p]--;
      given--;
    }
  }
  return sizes;
}

/** Wealth before groups and rescaling. */
function drawWealth(
  wealth: WealthFile,
  inputs: Inputs,
  place: Uint32Array,
  places: number,
  draws: Draws,
): Float64Array {
  const n = place.length;
  const latent = new Float64Array(n);
  draws.normals('initialWealth', 0, latent);
  if (wealth.between_places > 0) {
    const effect = placeEffects(place, places, draws);
    const between = Math.sqrt(wealth.between_places);
    const within = Math.sqrt(1 - wealth.between_places);
    for (let i = 0; i < n; i++) latent[i] = between * effect[place[i]] + within * latent[i];
  }
  const quantile = wealthQuantile(wealth, inputs);
  for (let i = 0; i < n; i++) latent[i] = quantile(latent[i]);
  return latent;
}

/**
 * Place effects with mean 0 and variance 1 over households, so that the between-place share asked for is met
 * even with few places (their raw variance would vary by a quarter with thirty of them).
 */
function placeEffects(place: Uint32Array, places: number, draws: Draws): Float64Array {
  const effect = new Float64Array(places);
  draws.normals('initialPlaceWealth', 0, effect);
  const size = new Float64Array(places);
  for (let i = 0; i < place.length; i++) size[place[i]]++;
  let centre = 0;
  for (let p = 0; p < places; p++) centre += size[p] * effect[p];
  centre /= place.length;
  let variance = 0;
  for (let p = 0; p < places; p++) {
    effect[p] -= centre;
    variance += size[p] * effect[p] * effect[p];
  }
  const sd = Math.sqrt(variance / place.length);
  for (let p = 0; p < places; p++) effect[p] /= sd;
  return effect;
}

/** Standard deviation of log of a lognormal with a given Gini: G = 2Φ(s/√2) − 1 (Aitchison and Brown 1957). */
export function sdLogOfGini(gini: number): number {
  return Math.SQRT2 * normalQuantile((1 + gini) / 2);
}

/** The shape's quantile function, as a function of a standard normal draw. */
function wealthQuantile(wealth: WealthFile, inputs: Inputs): (latent: number) => number {
  switch (wealth.shape) {
    case 'lognormal': {
      const s = wealth.sd_log ?? sdLogOfGini(wealth.gini!);
      return (x) => exp(s * x);
    }
    case 'pareto_tail': {
      const s = wealth.sd_log ?? sdLogOfGini(wealth.gini!);
      const { above_quantile: above, exponent } = wealth.pareto_tail!;
      const start = normalQuantile(above);
      const from = exp(s * start);
      // 1 − Φ(x) as Φ(−x), which keeps its digits far out
      return (x) => (x <= start ? exp(s * x) : from * pow((1 - above) / normalCdf(-x), 1 / exponent));
    }
    case 'quantile_shares': {
      const quantile = splitHistogram(wealth.quantile_shares!);
      return (x) => quantile(normalCdf(x), normalCdf(-x));
    }
    case 'sample': {
      const { values, cumulative } = inputs.sample!;
      return (x) => {
        const u = normalCdf(x);
        let low = 0;
        let high = values.length - 1;
        while (low < high) {
          const middle = (low + high) >>> 1;
          if (cumulative[middle] >= u) high = middle;
          else low = middle + 1;
        }
        return values[low];
      };
    }
  }
}

/**
 * Quantile function with given shares of quantile groups and mean 1: within each group the split histogram of
 * Cowell and Mehta (1982, Rev. Econ. Stud. 49), which meets each group's mean with two uniform pieces; bounds
 * lie half-way between neighbouring means, the bottom starts at 0 and the top group follows a Pareto law with the
 * right mean.
 */
export function splitHistogram(shares: readonly number[]): (u: number, upper: number) => number {
  const k = shares.length;
  const means = shares.map((value) => value * k);
  const bound = means.map((m, g) => (g === 0 ? 0 : (means[g - 1]! + m) / 2));
  return (u, upper) => {
    const g = Math.min(k - 1, Math.floor(u * k));
    const low = bound[g]!;
    const m = means[g]!;
    if (g === k - 1) {
      const tail = Math.min(1, upper * k);
      // mean of a Pareto law from `low` with exponent a is low·a/(a − 1)
      return m > low ? low * pow(tail, (low - m) / m) : low;
    }
    const high = bound[g + 1]!;
    const within = u * k - g;
    if (high <= low) return low;
    const below = (high - m) / (high - low);
    return within < below ? low + ((m - low) * within) / below : m + ((high - m) * (within - below)) / (1 - below);
  };
}

function mean(x: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < x.length; i++) sum += x[i];
  return sum / x.length;
}
