/**
 * From the rows of a frame to a sample: filters, the survey draw, terms, missing values, groups, singletons.
 */

import { drawSurvey } from './draw.js';
import type { Regressor, Sample } from './fit.js';
import { refuse } from './fit.js';
import { type Column, type Frame, pick } from './frame.js';
import { cells, type Groups, groupsOf, selectGroups, withoutSingletons } from './groups.js';
import { type Estimate, errorsOf, type Filter, type Grouping, groupingsOf } from './plan.js';
import { columnsOfGrouping, TermValues } from './terms.js';

/** A sample and how it came about. */
export interface Assembled {
  readonly sample: Sample;
  /** Rows after `where` and the draw. */
  readonly chosen: number;
  /** Rows dropped because some column is missing. */
  readonly missingRows: number;
  /** Missing values by column or term; a row may count in several. */
  readonly missing: Readonly<Record<string, number>>;
  /** Rows alone in a group of an absorbed effect. */
  readonly singletons: number;
  /** Distinct households, null without such a column. */
  readonly households: number | null;
  /** Households of the survey draw, null where everyone is taken. */
  readonly drawn: readonly number[] | null;
  readonly notes: readonly string[];
}

/**
 * Builds the sample of an estimate.
 *
 * @param frame - rows with every column the estimate reads
 * @param place - for messages
 * @param seed, replicate - of the survey draw
 * @throws {InputError} empty-sample, too-few-places
 */
export function assemble(frame: Frame, estimate: Estimate, place: string, seed: string, replicate: number): Assembled {
  const notes: string[] = [];
  let rows = filtered(frame, estimate);
  let drawnHouseholds: readonly number[] | null = null;
  if (rows.length === 0) {
    refuse('empty-sample', place, `no row passes where: ${JSON.stringify(estimate.where)}`, 'widen the filter');
  }
  if (estimate.draw !== 'everyone') {
    const { draw } = estimate;
    const column = (name: string): Column => frame.columns.get(name) as Column;
    const drawn = drawSurvey(draw, column('place'), column('household'), rows, seed, replicate);
    if (drawn.available < draw.places) {
      refuse(
        'too-few-places',
        place,
        `the survey asks for ${draw.places} places and there are ${drawn.available}`,
        'ask for fewer places',
      );
    }
    if (drawn.short > 0) {
      notes.push(
        `${drawn.short} of the ${draw.places} places drawn have fewer than ${draw.households_per_place} households; all of them were taken.`,
      );
    }
    rows = drawn.rows;
    drawnHouseholds = drawn.households;
  }
  const chosen = rows.length;

  const values = new TermValues(frame, place);
  let outcome = values.of(estimate.outcome, rows)[0];
  let covariates = estimate.covariates.flatMap((term) => values.of(term, rows));
  let endogenous = estimate.endogenous?.flatMap((term) => values.of(term, rows));
  let instruments = estimate.instruments?.flatMap((term) => values.of(term, rows));
  let effects = groupingsOf(estimate.effects).map((grouping) => groupColumns(frame, grouping, rows));
  let clusters = groupingsOf(estimate.cluster).map((grouping) => groupColumns(frame, grouping, rows));

  // a row must have every value: count what lacks by column, then keep the complete ones
  const missing: Record<string, number> = {};
  const alive = new Uint8Array(chosen).fill(1);
  const count = (name: string, lacks: (r: number) => boolean): void => {
    let number = 0;
    for (let r = 0; r < chosen; r++) {
      if (lacks(r)) {
        number++;
        alive[r] = 0;
      }
    }
    if (number > 0) missing[name] = number;
  };
  for (const x of [outcome, ...covariates, ...(endogenous ?? []), ...(instruments ?? [])]) {
    count(x.name, (r) => !Number.isFinite(x.values[r]));
  }
  for (const g of [...effects, ...clusters]) count(g.name, (r) => g.lacking[r] === 1);
  let complete = 0;
  for (let r = 0; r < chosen; r++) complete += alive[r];
  const missingRows = chosen - complete;
  if (complete === 0) {
    const worst = Object.entries(missing).sort((a, b) => b[1] - a[1])[0];
    refuse(
      'empty-sample',
      place,
      `none of the ${chosen} rows is complete: ${worst[0]} is missing in ${worst[1]}`,
      'leave the term out, or choose rows that have it',
    );
  }
  const keep = (kept: Int32Array): void => {
    const less = (x: Regressor): Regressor => {
      const out = new Float64Array(kept.length);
      for (let r = 0; r < kept.length; r++) out[r] = x.values[kept[r]];
      return { name: x.name, values: out };
    };
    outcome = less(outcome);
    covariates = covariates.map(less);
    endogenous = endogenous?.map(less);
    instruments = instruments?.map(less);
    effects = effects.map((g) => ({ ...selectGroups(g, kept), lacking: NONE }));
    clusters = clusters.map((g) => ({ ...selectGroups(g, kept), lacking: NONE }));
    const moved = new Int32Array(kept.length);
    for (let r = 0; r < kept.length; r++) moved[r] = rows[kept[r]];
    rows = moved;
  };
  if (missingRows > 0) {
    const kept = new Int32Array(complete);
    for (let r = 0, k = 0; r < chosen; r++) if (alive[r]) kept[k++] = r;
    keep(kept);
  }
  const lonely = withoutSingletons(effects, rows.length);
  const singletons = lonely ? rows.length - lonely.length : 0;
  if (lonely) {
    if (lonely.length === 0) {
      refuse('empty-sample', place, 'every row is alone in its absorbed group', 'absorb a coarser grouping');
    }
    keep(lonely);
  }
  const household = frame.columns.get('household');
  const households = household
    ? new Set(
        household.kind === 'number'
          ? (pick(household, rows) as { values: Float64Array }).values
          : (pick(household, rows) as { codes: Int32Array }).codes,
      ).size
    : null;
  return {
    sample: {
      place,
      outcome,
      covariates,
      ...(endogenous ? { endogenous } : {}),
      ...(instruments ? { instruments } : {}),
      constant: estimate.constant,
      effects,
      clusters,
      errors: errorsOf(estimate),
      level: estimate.level,
    },
    chosen,
    missingRows,
    missing,
    singletons,
    households,
    drawn: drawnHouseholds,
    notes,
  };
}

const NONE = new Uint8Array(0);

/** Rows that pass every filter, ascending. Missing values pass none. */
function filtered(frame: Frame, estimate: Estimate): Int32Array {
  const alive = new Uint8Array(frame.rows).fill(1);
  let left = frame.rows;
  for (const [name, filter] of Object.entries(estimate.where)) {
    const column = frame.columns.get(name);
    if (column === undefined) throw new Error(`no column ${name}`);
    const passes = test(column, filter);
    for (let i = 0; i < frame.rows; i++) {
      if (alive[i] && !passes(i)) {
        alive[i] = 0;
        left--;
      }
    }
  }
  const rows = new Int32Array(left);
  for (let i = 0, r = 0; i < frame.rows; i++) if (alive[i]) rows[r++] = i;
  return rows;
}

/** Whether row i passes a filter: a value, texts, a range [from, to] of numbers, or {in: …}. */
function test(column: Column, filter: Filter): (i: number) => boolean {
  if (column.kind === 'text') {
    const wanted = Array.isArray(filter) ? filter : typeof filter === 'object' && 'in' in filter ? filter.in : [filter];
    const codes = new Set(wanted.map((text) => column.levels.indexOf(String(text))).filter((code) => code >= 0));
    return (i) => codes.has(column.codes[i]);
  }
  const { values } = column;
  if (Array.isArray(filter) && filter.length === 2) {
    const [from, to] = filter.map(Number);
    return (i) => values[i] >= from && values[i] <= to;
  }
  if (typeof filter === 'object' && !Array.isArray(filter) && !('in' in filter)) {
    const { from = -Infinity, to = Infinity } = filter as { from?: number; to?: number };
    return (i) => values[i] >= from && values[i] <= to;
  }
  const list = Array.isArray(filter) ? filter : typeof filter === 'object' && 'in' in filter ? filter.in : [filter];
  const wanted = new Set(list.map(Number));
  return (i) => wanted.has(values[i]);
}

/** A grouping at some rows, and which rows lack it. */
function groupColumns(frame: Frame, grouping: Grouping, rows: Int32Array): Groups & { readonly lacking: Uint8Array } {
  const lacking = new Uint8Array(rows.length);
  const parts = columnsOfGrouping(grouping).map((name) => {
    const column = frame.columns.get(name);
    if (column === undefined) throw new Error(`no column ${name}`);
    const source = column.kind === 'number' ? column.values : column.codes;
    const codes = new Float64Array(rows.length);
    for (let r = 0; r < rows.length; r++) {
      const v = source[rows[r]];
      if (Number.isNaN(v) || (column.kind === 'text' && v < 0)) lacking[r] = 1;
      else codes[r] = v;
    }
    return groupsOf(name, codes);
  });
  const groups = parts.reduce((a, b) => cells(a, b));
  return { ...groups, lacking };
}
