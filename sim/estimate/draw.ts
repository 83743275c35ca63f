/**
 * The sample a survey would draw: places first, then households in each.
 *
 * The draw depends on the seed, the replicate and the size asked for, not on the arm or the estimate, so that arms and
 * specifications are compared on the same households.
 */
import seedrandom from 'seedrandom';
import type { Column } from './frame.js';

export interface Survey {
  readonly places: number;
  readonly households_per_place: number;
}

export interface Drawn {
  /** Rows of the households drawn, ascending. */
  readonly rows: Int32Array;
  /** Households drawn, ascending within place. */
  readonly households: readonly number[];
  /** Places that had fewer households than asked for. */
  readonly short: number;
  /** Places there were to draw from. */
  readonly available: number;
}

/** Value of a column as a key: numbers as they are, text by code. */
function keys(column: Column): Float64Array | Int32Array {
  return column.kind === 'number' ? column.values : column.codes;
}

/**
 * Draws a survey from the rows of one replicate.
 *
 * @param place, household - columns of all rows; households are the same where both agree
 * @param rows - the rows to draw from
 * @returns undefined when there are fewer places than asked for is not an error here: `available` tells
 */
export function drawSurvey(
  survey: Survey,
  place: Column,
  household: Column,
  rows: Int32Array,
  seed: string,
  replicate: number,
): Drawn {
  const places = keys(place);
  const households = keys(household);
  const members = new Map<number, Set<number>>();
  for (const i of rows) {
    const p = places[i];
    if (Number.isNaN(p) || Number.isNaN(households[i])) continue;
    let set = members.get(p);
    if (set === undefined) members.set(p, (set = new Set()));
    set.add(households[i]);
  }
  const random = seedrandom(
    `${seed} | replicate ${replicate} | survey of ${survey.places} places × ${survey.households_per_place} households`,
  );
  const ordered = [...members.keys()].sort((a, b) => a - b);
  const chosen = some(ordered, survey.places, random);
  let short = 0;
  const taken: number[] = [];
  const sample = new Map<number, Set<number>>();
  for (const p of chosen.sort((a, b) => a - b)) {
    const all = [...(members.get(p) as Set<number>)].sort((a, b) => a - b);
    if (all.length < survey.households_per_place) short++;
    const set = new Set(some(all, survey.households_per_place, random));
    taken.push(...[...set].sort((a, b) => a - b));
    sample.set(p, set);
  }
  const kept: number[] = [];
  for (const i of rows) if (sample.get(places[i])?.has(households[i])) kept.push(i);
  return { rows: Int32Array.from(kept), households: taken, short, available: ordered.length };
}

/** `count` of a list without replacement (all when it is shorter), by a partial Fisher–Yates shuffle. */
function some(list: readonly number[], count: number, random: () => number): number[] {
  const pool = [...list];
  const m = Math.min(count, pool.length);
  for (let i = 0; i < m; i++) {
    const j = i + Math.floor(random() * (pool.length - i));
    [pool[i], pool[j]] = [pool[j], pool[i]];
  }
  return pool.slice(0, m);
}
