/**
 * Terms of a regression: which columns they need, what they are called, and their values.
 */

import { log } from '../../network/elementary.js';
import { nearest } from '../../network/errors.js';
import type { Path, StudyProblem } from '../study/problems.js';
import { type Regressor, refuse } from './fit.js';
import type { Column, Frame } from './frame.js';
import type { Estimate, Grouping, Term } from './plan.js';
import { groupingsOf } from './plan.js';

/** Dummies beyond this many cells would fill memory: 800 megabytes. */
const MOST_DUMMY_CELLS = 1e8;

type Kinds = ReadonlyMap<string, Column['kind']>;

/** What a plain name stands for: a column, the log of one, or nothing. */
function resolve(name: string, kinds: Kinds): { column: string; log: boolean } | undefined {
  if (kinds.has(name)) return { column: name, log: false };
  if (name.startsWith('log_') && kinds.has(name.slice(4))) return { column: name.slice(4), log: true };
  return undefined;
}

/** Columns a term reads; a lag or lead also reads what says who and when. */
export function columnsOfTerm(term: Term, kinds: Kinds): string[] {
  if (typeof term === 'string') return [resolve(term, kinds)?.column ?? term];
  if ('dummy' in term) return [term.dummy];
  if ('log' in term) return columnsOfTerm(term.log, kinds);
  if ('square' in term) return columnsOfTerm(term.square, kinds);
  if ('power' in term) return columnsOfTerm(term.power[0], kinds);
  if ('product' in term) return term.product.flatMap((t) => columnsOfTerm(t, kinds));
  const dated = [
    'household',
    'generation',
    ...(kinds.has('arm') ? ['arm'] : []),
    ...(kinds.has('replicate') ? ['replicate'] : []),
  ];
  return [...columnsOfTerm('lag' in term ? term.lag : term.lead, kinds), ...dated];
}

/** Whether a term reads a dummy of this column, anywhere in it. */
function hasDummyOf(term: Term, column: string): boolean {
  if (typeof term === 'string') return false;
  if ('dummy' in term) return term.dummy === column;
  if ('product' in term) return term.product.some((t) => hasDummyOf(t, column));
  if ('power' in term) return hasDummyOf(term.power[0], column);
  return Object.values(term).some((t) => hasDummyOf(t as Term, column));
}

/** Every term of an estimate, with its place in it. */
function termsOf(estimate: Estimate): { term: Term; path: Path }[] {
  const list = (field: string, terms: readonly Term[] | undefined): { term: Term; path: Path }[] =>
    (terms ?? []).map((term, i) => ({ term, path: [field, i] }));
  return [
    { term: estimate.outcome, path: ['outcome'] },
    ...list('covariates', estimate.covariates),
    ...list('endogenous', estimate.endogenous),
    ...list('instruments', estimate.instruments),
  ];
}

/** True when an estimate runs over all its arms at once: it says so, or compares them by {dummy: arm}. */
export function poolsArms(estimate: Estimate): boolean {
  return estimate.pool_arms ?? termsOf(estimate).some(({ term }) => hasDummyOf(term, 'arm'));
}

/** Columns of a grouping. */
export function columnsOfGrouping(grouping: Grouping): readonly string[] {
  return typeof grouping === 'string' ? [grouping] : grouping.product;
}

/** Every column an estimate reads. */
export function columnsOfEstimate(estimate: Estimate, kinds: Kinds): string[] {
  const out = new Set<string>();
  for (const { term } of termsOf(estimate)) for (const name of columnsOfTerm(term, kinds)) out.add(name);
  for (const grouping of [...groupingsOf(estimate.effects), ...groupingsOf(estimate.cluster)]) {
    for (const name of columnsOfGrouping(grouping)) out.add(name);
  }
  for (const name of Object.keys(estimate.where)) out.add(name);
  if (estimate.draw !== 'everyone') for (const name of ['place', 'household']) out.add(name);
  if (kinds.has('household')) out.add('household');
  return [...out];
}

/** Names that are no column, or are used against their kind. `at` is where the estimate stands. */
export function checkTerms(estimate: Estimate, kinds: Kinds, at: Path): StudyProblem[] {
  const problems: StudyProblem[] = [];
  const names = [...kinds.keys()];
  const unknown = (name: string, path: Path, atKey = false): void => {
    const guess = nearest(name, [...names, ...names.map((n) => `log_${n}`)]);
    problems.push({
      code: 'unknown-column',
      path: [...at, ...path],
      atKey,
      problem: `${estimate.name}: there is no column '${name}'`,
      remedy: guess === undefined ? `use one of ${names.join(', ')}` : `did you mean '${guess}'?`,
    });
  };
  const need = (what: string, columns: readonly string[], path: Path): void => {
    const missing = columns.filter((name) => !kinds.has(name));
    if (missing.length > 0) {
      problems.push({
        code: 'missing-column',
        path: [...at, ...path],
        problem: `${estimate.name}: ${what} needs the column${missing.length > 1 ? 's' : ''} ${missing.join(' and ')}, which ${missing.length > 1 ? 'are' : 'is'} not there`,
        remedy: `use data with ${columns.join(' and ')}, or leave ${what} out`,
      });
    }
  };
  const check = (term: Term, path: Path): void => {
    if (typeof term === 'string') {
      const found = resolve(term, kinds);
      if (!found) unknown(term, path);
      else if (kinds.get(found.column) === 'text') {
        problems.push({
          code: 'text-term',
          path: [...at, ...path],
          problem: `${estimate.name}: the column ${found.column} is text`,
          remedy: `write {dummy: ${found.column}} for a 0/1 term per value`,
        });
      }
      return;
    }
    if ('dummy' in term) {
      if (!kinds.has(term.dummy)) unknown(term.dummy, [...path, 'dummy']);
      return;
    }
    if ('lag' in term || 'lead' in term) need('lag' in term ? 'lag' : 'lead', ['household', 'generation'], path);
    if ('product' in term) {
      term.product.forEach((inner, i) => {
        check(inner, [...path, 'product', i]);
      });
    } else if ('power' in term) check(term.power[0], [...path, 'power', 0]);
    else for (const [key, inner] of Object.entries(term)) check(inner as Term, [...path, key]);
  };
  for (const { term, path } of termsOf(estimate)) check(term, path);
  for (const field of ['effects', 'cluster'] as const) {
    const written = estimate[field];
    groupingsOf(written).forEach((grouping, i) => {
      for (const name of columnsOfGrouping(grouping)) {
        if (!kinds.has(name)) unknown(name, typeof written === 'string' ? [field] : [field, i]);
      }
    });
  }
  for (const [name, filter] of Object.entries(estimate.where)) {
    const kind = kinds.get(name);
    if (kind === undefined) unknown(name, ['where', name], true);
    else {
      const values = Array.isArray(filter)
        ? filter
        : typeof filter === 'object' && 'in' in filter
          ? filter.in
          : typeof filter === 'object'
            ? [0]
            : [filter];
      const wrong = values.find((v) => (typeof v === 'string') !== (kind === 'text'));
      if (wrong !== undefined) {
        problems.push({
          code: 'wrong-type',
          path: [...at, 'where', name],
          problem: `${estimate.name}: ${name} is ${kind === 'text' ? 'text' : 'a number'}, but the filter is ${JSON.stringify(filter)}`,
          remedy: kind === 'text' ? 'give text or a list of texts' : 'give a number, or a range [from, to]',
        });
      }
    }
  }
  if (estimate.draw !== 'everyone') need('draw', ['place', 'household'], ['draw']);
  return problems;
}

/** What a term's values are computed from: columns, and for every row the row of the same household a generation on. */
export class TermValues {
  readonly #frame: Frame;
  readonly #kinds: Kinds;
  readonly #dated = new Map<number, Int32Array>();

  readonly #place: string;

  /** @param place - for messages */
  constructor(frame: Frame, place: string) {
    this.#frame = frame;
    this.#place = place;
    this.#kinds = new Map([...frame.columns].map(([name, column]) => [name, column.kind]));
  }

  /** Values of a term at some rows (−1: missing), one regressor or, for dummies, several. */
  of(term: Term, rows: Int32Array): Regressor[] {
    if (typeof term === 'string') {
      const found = resolve(term, this.#kinds);
      if (!found) throw new Error(`no column for ${term}`);
      const values = this.#numbers(found.column, rows);
      if (found.log) inPlace(values, logarithm);
      return [{ name: term, values }];
    }
    if ('dummy' in term) return this.#dummies(term.dummy, term.base, rows);
    if ('log' in term) return this.#each(term.log, rows, 'log', logarithm);
    if ('square' in term) return this.#each(term.square, rows, 'square', (x) => x * x);
    if ('power' in term) {
      const [inner, exponent] = term.power;
      return this.of(inner, rows).map(({ name, values }) => {
        inPlace(values, (x) => {
          let p = x;
          for (let i = 1; i < exponent; i++) p *= x;
          return p;
        });
        return { name: `power(${name}, ${exponent})`, values };
      });
    }
    if ('product' in term) {
      const [a, b] = term.product;
      const right = this.of(b, rows);
      return this.of(a, rows).flatMap((x) =>
        right.map((y) => ({
          name: `product(${x.name}, ${y.name})`,
          values: x.values.map((v, r) => v * y.values[r]),
        })),
      );
    }
    const step = 'lag' in term ? -1 : 1;
    const dated = this.#rowsAt(step);
    const moved = new Int32Array(rows.length);
    for (let r = 0; r < rows.length; r++) moved[r] = rows[r] < 0 ? -1 : dated[rows[r]];
    return this.of('lag' in term ? term.lag : term.lead, moved).map(({ name, values }) => ({
      name: `${step < 0 ? 'lag' : 'lead'}(${name})`,
      values,
    }));
  }

  #numbers(name: string, rows: Int32Array): Float64Array {
    const column = this.#frame.columns.get(name);
    if (column?.kind !== 'number') throw new Error(`the column ${name} is not a number column`);
    const values = new Float64Array(rows.length);
    const source = column.values;
    for (let r = 0; r < rows.length; r++) values[r] = rows[r] < 0 ? NaN : source[rows[r]];
    return values;
  }

  #each(inner: Term, rows: Int32Array, word: string, f: (x: number) => number): Regressor[] {
    return this.of(inner, rows).map(({ name, values }) => {
      inPlace(values, f);
      return { name: word === 'log' ? `log_${name}` : `${word}(${name})`, values };
    });
  }

  #dummies(name: string, base: string | number | boolean | undefined, rows: Int32Array): Regressor[] {
    const column = this.#frame.columns.get(name);
    if (column === undefined) throw new Error(`no column ${name}`);
    const n = rows.length;
    const codes = new Float64Array(n);
    let present: number[];
    let label: (code: number) => string;
    if (column.kind === 'text') {
      for (let r = 0; r < n; r++) codes[r] = rows[r] < 0 || column.codes[rows[r]] < 0 ? NaN : column.codes[rows[r]];
      label = (code) => column.levels[code];
      present = [...new Set(codes)].filter((code) => !Number.isNaN(code));
      // arms keep the order of the study, so that the first one is what others are compared with
      if (name === 'arm') present.sort((a, b) => a - b);
      else present.sort((a, b) => (label(a) < label(b) ? -1 : 1));
    } else {
      for (let r = 0; r < n; r++) codes[r] = rows[r] < 0 ? NaN : column.values[rows[r]];
      label = String;
      present = [...new Set(codes)].filter((code) => !Number.isNaN(code)).sort((a, b) => a - b);
    }
    if (present.length * n > MOST_DUMMY_CELLS) {
      refuse(
        'too-many-dummies',
        this.#place,
        `{dummy: ${name}} makes ${present.length} terms over ${n} rows`,
        `absorb it: effects: [${name}]`,
      );
    }
    const chosen =
      base === undefined
        ? undefined
        : present.find(
            (code) =>
              label(code) === String(Number.isNaN(Number(base)) ? base : column.kind === 'text' ? base : Number(base)),
          );
    const left = chosen ?? present[0];
    return present
      .filter((code) => code !== left)
      .map((code) => ({
        name: `${name}=${label(code)}`,
        values: codes.map((v) => (Number.isNaN(v) ? NaN : v === code ? 1 : 0)),
      }));
  }

  /** For every row, the row of the same household (arm and replicate) one generation on or back, −1 when none. */
  #rowsAt(step: number): Int32Array {
    const known = this.#dated.get(step);
    if (known) return known;
    const { rows, columns } = this.#frame;
    const code = (name: string): Float64Array | Int32Array | undefined => {
      const column = columns.get(name);
      return column === undefined ? undefined : column.kind === 'number' ? column.values : column.codes;
    };
    const generation = code('generation') as Float64Array | Int32Array;
    const who = ['arm', 'replicate', 'household'].map(code).filter((v) => v !== undefined);
    // a dynasty's number, from its parts one after another
    let identity = new Int32Array(rows);
    for (const part of who) {
      const seen = new Map<number, Map<number, number>>();
      const next = new Int32Array(rows);
      let count = 0;
      for (let i = 0; i < rows; i++) {
        let inner = seen.get(identity[i]);
        if (inner === undefined) seen.set(identity[i], (inner = new Map()));
        let number = inner.get(part[i]);
        if (number === undefined) inner.set(part[i], (number = count++));
        next[i] = number;
      }
      identity = next;
    }
    let first = Infinity;
    let last = -Infinity;
    for (let i = 0; i < rows; i++) {
      if (generation[i] < first) first = generation[i];
      if (generation[i] > last) last = generation[i];
    }
    const span = last - first + 1;
    const where = new Map<number, number>();
    for (let i = 0; i < rows; i++) {
      if (!Number.isNaN(generation[i])) where.set(identity[i] * span + (generation[i] - first), i);
    }
    const out = new Int32Array(rows).fill(-1);
    for (let i = 0; i < rows; i++) {
      const t = generation[i] + step;
      if (t >= first && t <= last) out[i] = where.get(identity[i] * span + (t - first)) ?? -1;
    }
    this.#dated.set(step, out);
    return out;
  }
}

function logarithm(x: number): number {
  return x > 0 ? log(x) : NaN;
}

function inPlace(values: Float64Array, f: (x: number) => number): void {
  for (let i = 0; i < values.length; i++) values[i] = f(values[i]);
}
