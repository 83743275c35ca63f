/**
 * Configuration model: given degrees, tie ends matched at random (Bollobás 1980; Molloy and Reed 1995).
 *
 * Places and groups enter as in blocks: a share of tie ends is bound to its place, and of those a share to its group
 * in the place; bound ends are matched among themselves, the rest with anyone. The bound shares are Coleman's inbreeding
 * form of the shares asked for, (share − chance) / (1 − chance), since free ends stay at home by chance too. Loops and
 * second ties that the matching leaves are swapped away within the same pool (degrees stay); ends that no swap can
 * place, as in a pool with fewer members than one of them has ends, are matched more widely. With degrees that differ
 * much in small groups the same-group share therefore falls a little short (`reached` tells by how much).
 */
import { InputError } from '../errors.js';
import type { Labels, Ties, Uniform } from '../graph.js';
import { TieSlots } from '../mix/tie-slots.js';
import { lognormalDegrees, poissonDegrees } from './degree-draw.js';
import { cells, shuffle } from './order.js';
import { checkMeanDegree, checkShare, infeasible } from './refuse.js';
import type { ConfigurationSpec } from './spec.js';

/** Swaps tried for one bad tie within its pool, and again within its place; among all ties, 20 times as many. */
const TRIES = 200;

/**
 * @param spec - see {@link ConfigurationSpec}
 * @param labels - places and groups
 * @param given - degrees read from the file that `degrees: {kind: file}` names, length n; else null
 * @returns ties with exactly the degrees drawn or given. Drawn degrees with an odd sum get one more end at the first
 *   household that has room. Cost O(n + m) expected.
 * @throws InputError `degrees-odd`, `degrees-not-graphical` for given degrees that no network has,
 *   `network-infeasible` for shares out of reach
 */
export function configuration(
  spec: ConfigurationSpec,
  labels: Labels,
  uniform: Uniform,
  given: ArrayLike<number> | null,
): Ties {
  const { n } = labels;
  if (spec.within_place !== undefined) checkShare('within_place', spec.within_place);
  if (spec.within_group !== undefined) checkShare('within_group', spec.within_group);
  const degree = degreesOf(spec, n, uniform, given);
  return match(degree, spec, labels, uniform);
}

function degreesOf(spec: ConfigurationSpec, n: number, uniform: Uniform, given: ArrayLike<number> | null): Uint32Array {
  const { degrees } = spec;
  if (degrees.kind === 'file') {
    if (given === null) throw new Error('configuration: degrees of a file were not read by the caller');
    return checkGraphical(given, n, degrees.path);
  }
  checkMeanDegree('degrees.mean', degrees.mean, n);
  const drawn =
    degrees.kind === 'poisson'
      ? poissonDegrees(n, degrees.mean, uniform)
      : lognormalDegrees(n, degrees.mean, degrees.sd_log, uniform);
  let sum = 0;
  for (const k of drawn) sum += k;
  if (sum % 2 === 1) {
    const i = drawn.findIndex((k) => k < n - 1);
    if (i >= 0) drawn[i]++;
    else drawn[0]--;
  }
  return drawn;
}

/** Whole numbers, an even sum, and the condition of Erdős and Gallai (1960). Cost O(n log n). */
function checkGraphical(given: ArrayLike<number>, n: number, path: string): Uint32Array {
  const fail = (code: string, problem: string, remedy: string): InputError =>
    new InputError({ code, place: path, problem, remedy });
  if (given.length !== n) {
    throw fail('degrees-count', `${given.length} degrees for ${n} households`, 'give one degree for each household');
  }
  let sum = 0;
  for (let i = 0; i < n; i++) {
    const k = given[i];
    if (!(Number.isInteger(k) && k >= 0 && k < n)) {
      throw fail('degrees-value', `degree ${k} of household ${i}`, `give whole numbers from 0 to ${n - 1}`);
    }
    sum += k;
  }
  if (sum % 2 === 1)
    throw fail('degrees-odd', `degrees sum to ${sum}, an odd number`, 'every tie has two ends: mend one degree');
  const degree = Uint32Array.from(given);
  const sorted = degree.slice().sort().reverse();
  // Σ of the k largest ≤ k(k−1) + Σ over the rest of min(k, degree), with the rest's sum kept by a moving boundary
  const below = new Float64Array(n + 1);
  for (let i = n - 1; i >= 0; i--) below[i] = below[i + 1] + sorted[i];
  let left = 0;
  let boundary = n;
  for (let k = 1; k <= n; k++) {
    left += sorted[k - 1];
    while (boundary > 0 && sorted[boundary - 1] < k) boundary--;
    const full = Math.max(boundary, k);
    if (left > k * (k - 1) + k * (full - k) + below[full]) {
      throw fail(
        'degrees-not-graphical',
        `the ${k} largest degrees sum to ${left}, more than ${n} households can take up`,
        'lower the largest degrees',
      );
    }
  }
  return degree;
}

function match(degree: Uint32Array, spec: ConfigurationSpec, labels: Labels, uniform: Uniform): Ties {
  const { n } = labels;
  const sorted = cells(labels);
  const { members, places, placeStart, cellStart, placeCells } = sorted;
  let total = 0;
  for (let i = 0; i < n; i++) total += degree[i];
  const { placeBound, groupBound } = boundShares(degree, total, spec, sorted);

  const source = new Uint32Array(total / 2);
  const target = new Uint32Array(total / 2);
  // ties of a pool stand together, and the pools of a place
  const pools: Pool[] = [];
  let m = 0;
  const free: number[] = [];
  const pair = (ends: Uint32Array): void => {
    const from = m;
    shuffle(ends, uniform);
    for (let at = 0; at + 1 < ends.length; at += 2) {
      source[m] = ends[at];
      target[m++] = ends[at + 1];
    }
    pools.push({ from, to: m, placeFrom: from, placeTo: m });
  };
  for (let p = 0; p < places; p++) {
    const firstPool = pools.length;
    const placeFrom = m;
    const inPlace: number[] = [];
    for (let c = placeCells[p]; c < placeCells[p + 1]; c++) {
      const inGroup: number[] = [];
      // a member can have no more bound ends than there are others to meet
      const others = cellStart[c + 1] - cellStart[c] - 1;
      const neighbours = placeStart[p + 1] - placeStart[p] - 1;
      for (let at = cellStart[c]; at < cellStart[c + 1]; at++) {
        const i = members[at];
        let own = 0;
        let here = 0;
        for (let k = 0; k < degree[i]; k++) {
          if (here < neighbours && uniform() < placeBound) {
            here++;
            if (own < others && uniform() < groupBound) {
              own++;
              inGroup.push(i);
            } else inPlace.push(i);
          } else free.push(i);
        }
      }
      if (inGroup.length % 2 === 1) inPlace.push(inGroup.splice(Math.floor(uniform() * inGroup.length), 1)[0]);
      pair(Uint32Array.from(inGroup));
    }
    if (inPlace.length % 2 === 1) free.push(inPlace.splice(Math.floor(uniform() * inPlace.length), 1)[0]);
    pair(Uint32Array.from(inPlace));
    for (let pool = firstPool; pool < pools.length; pool++) pools[pool] = { ...pools[pool], placeFrom, placeTo: m };
  }
  pair(Uint32Array.from(free));
  const slots = new TieSlots(n, source, target);
  repair(slots, pools, uniform);
  return slots.toTies(null);
}

/** Probability that a tie end is bound to its place, and that a bound one is bound to its group too. */
function boundShares(
  degree: Uint32Array,
  total: number,
  spec: ConfigurationSpec,
  sorted: ReturnType<typeof cells>,
): { placeBound: number; groupBound: number } {
  const { members, places, cellStart, placeCells } = sorted;
  // chance of each end to find its own place, and its own group there, its household's other ends left out
  let chancePlace = 0;
  let chanceGroup = 0;
  for (let p = 0; p < places; p++) {
    let inPlace = 0;
    for (let at = cellStart[placeCells[p]]; at < cellStart[placeCells[p + 1]]; at++) inPlace += degree[members[at]];
    for (let c = placeCells[p]; c < placeCells[p + 1]; c++) {
      let inCell = 0;
      for (let at = cellStart[c]; at < cellStart[c + 1]; at++) inCell += degree[members[at]];
      for (let at = cellStart[c]; at < cellStart[c + 1]; at++) {
        const k = degree[members[at]];
        if (k === 0) continue;
        if (total > k) chancePlace += ((k / total) * (inPlace - k)) / (total - k);
        if (inPlace > k) chanceGroup += ((k / total) * (inCell - k)) / (inPlace - k);
      }
    }
  }
  return {
    placeBound: bound('within_place', spec.within_place, chancePlace),
    groupBound: bound('within_group', spec.within_group, chanceGroup),
  };

  function bound(key: string, share: number | undefined, chance: number): number {
    if (share === undefined) return 0;
    // everybody alike: nothing to bind (1e-9: rounding of the sum)
    if (chance >= 1 - 1e-9) {
      if (share === 1) return 0;
      throw infeasible(key, `a share of ${share}, but everybody is in one ${key.slice(7)}`, `leave ${key} out`);
    }
    if (share < chance - 1e-12) {
      throw infeasible(
        key,
        `a share of ${share} is below what chance alone gives here, ${chance}`,
        'raise it or leave it out',
      );
    }
    return Math.max(0, (share - chance) / (1 - chance));
  }
}

/** Ties [from, to) were matched among themselves; [placeFrom, placeTo) are all ties matched inside the same place. */
interface Pool {
  readonly from: number;
  readonly to: number;
  readonly placeFrom: number;
  readonly placeTo: number;
}

/** Swaps loops and second ties away: within the pool first, then within the place, then among all ties. */
function repair(slots: TieSlots, pools: readonly Pool[], uniform: Uniform): void {
  const m = slots.source.length;
  const bad = (e: number): boolean =>
    slots.source[e] === slots.target[e] || slots.joined(slots.source[e], slots.target[e], 2) > 1;
  for (const { from, to, placeFrom, placeTo } of pools) {
    for (let e = from; e < to; e++) {
      if (!bad(e)) continue;
      if (mend(slots, e, from, to, TRIES, uniform)) continue;
      if (!mend(slots, e, placeFrom, placeTo, TRIES, uniform)) mend(slots, e, 0, m, 20 * TRIES, uniform);
    }
  }
  // what is left stands in a network so dense that a random partner almost never fits: look at every tie
  for (let e = 0; e < m; e++) {
    if (!bad(e)) continue;
    let done = false;
    for (let f = 0; f < m && !done; f++) {
      done = tryMend(slots, e, f);
      if (done) break;
      slots.turn(f);
      done = tryMend(slots, e, f);
    }
    if (!done) {
      throw infeasible(
        'degrees',
        'these degrees leave a household no one else to be tied to (one that has almost all others as neighbours)',
        'lower the largest degrees',
      );
    }
  }
}

function mend(slots: TieSlots, e: number, from: number, to: number, tries: number, uniform: Uniform): boolean {
  for (let t = 0; t < tries; t++) {
    const f = from + Math.floor(uniform() * (to - from));
    if (uniform() < 0.5) slots.turn(f);
    if (tryMend(slots, e, f)) return true;
  }
  return false;
}

/** Swaps far ends when both new ties are new; unlike a free swap, the old ones may be loops or repeats. */
function tryMend(slots: TieSlots, e: number, f: number): boolean {
  if (e === f) return false;
  const { source, target } = slots;
  const a = source[e];
  const b = target[e];
  const c = source[f];
  const d = target[f];
  if (a === d || c === b) return false;
  if (slots.joined(a, d, 1) > 0 || slots.joined(c, b, 1) > 0) return false;
  // a–d and c–b must not be the same pair either
  if (a === c || b === d) {
    if (a === c && b === d) return false;
    if (a === b || c === d) return false;
  }
  if (a === b && c === d) return false;
  slots.swap(e, f);
  return true;
}
