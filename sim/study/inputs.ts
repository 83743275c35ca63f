/**
 * The files a study names, read into columns: households, survey sample, ties, degrees.
 *
 * Takes text from a reader the caller supplies (disk, or files dropped on the page), so it runs anywhere. Every
 * fault is raised with file, row and column, all of a file's at once.
 */

import { NAMED_GRAPHS, namedSize } from '../../network/build/named.js';
import { InputError, nearest, type Problem } from '../../network/errors.js';
import { type CsvTable, readCsv } from '../../network/exchange/csv.js';
import { readTies } from '../../network/exchange/read-ties.js';
import type { Ties } from '../../network/graph.js';
import type { Study } from './complete.js';
import type { ParsedStudy } from './parse.js';
import type { Path } from './problems.js';
import type { Covariate } from './record.js';

/** A households file, one row a household in file order. */
export interface HouseholdsFile {
  readonly n: number;
  /** Ids as written, length n, all different. */
  readonly ids: readonly string[];
  readonly wealth: Float64Array;
  readonly place: Uint32Array;
  readonly placeNames: readonly string[];
  readonly group: Uint32Array;
  readonly groupNames: readonly string[];
  readonly covariates: readonly Covariate[];
}

/** A survey column ready for resampling. */
export interface Sample {
  /** Ascending values above 0. */
  readonly values: Float64Array;
  /** Share of all weight at or below each value; the last is 1. */
  readonly cumulative: Float64Array;
}

/** What a study's files hold; plain data. */
export interface Inputs {
  readonly households: HouseholdsFile | null;
  readonly sample: Sample | null;
  /** Ties by the path the study gives. */
  readonly ties: Readonly<Record<string, Ties>>;
  /** Degrees by the path the study gives. */
  readonly degrees: Readonly<Record<string, Float64Array>>;
  /** Text of every file, by the path the study gives, for hashing and for copies in the results folder. */
  readonly texts: Readonly<Record<string, string>>;
}

/** A file a study names and where it names it. */
export interface NamedFile {
  readonly path: string;
  /** Place in the study, for a file that cannot be found. */
  readonly at: Path;
}

/** Every file a study names, in the order of the study. */
export function filesOf(study: Study): NamedFile[] {
  const files: NamedFile[] = [];
  const { population } = study;
  if (population.households_file !== undefined) {
    files.push({ path: population.households_file, at: ['population', 'households_file'] });
  }
  if (population.wealth?.sample !== undefined) {
    files.push({ path: population.wealth.sample.file, at: ['population', 'wealth', 'sample', 'file'] });
  }
  study.arms.forEach(({ network }, a) => {
    if (!('kind' in network)) return;
    if (network.kind === 'file') files.push({ path: network.path, at: ['arms', a, 'network', 'path'] });
    if (network.kind === 'configuration' && network.degrees.kind === 'file') {
      files.push({ path: network.degrees.path, at: ['arms', a, 'network', 'degrees', 'path'] });
    }
  });
  return files;
}

/** Gives a file's text, or null when there is no such file. */
export type ReadText = (path: string) => Promise<string | null>;

/**
 * Reads and checks every file of a study.
 *
 * @throws {InputError} with every problem of the first faulty file, or of all missing files
 */
export async function loadInputs(parsed: ParsedStudy, read: ReadText): Promise<Inputs> {
  const { study } = parsed;
  const texts: Record<string, string> = {};
  const missing: Problem[] = [];
  for (const { path, at } of filesOf(study)) {
    if (path in texts) continue;
    const text = await read(path);
    if (text !== null) texts[path] = text;
    else {
      missing.push({
        code: 'no-such-file',
        place: parsed.place(at),
        problem: `file '${path}' was not found`,
        remedy: 'give its path relative to the study file',
      });
    }
  }
  if (missing.length > 0) throw new InputError(missing);

  const { population } = study;
  const householdsPath = population.households_file;
  const households = householdsPath === undefined ? null : readHouseholds(texts[householdsPath]!, householdsPath);
  if (households !== null) checkGroupNames(parsed, households);
  const sampled = population.wealth?.sample;
  const sample =
    sampled === undefined ? null : readSample(texts[sampled.file]!, sampled.file, sampled.column, sampled.weight);
  const n = households?.n ?? population.households!;
  const ids = households?.ids ?? null;
  const ties: Record<string, Ties> = {};
  const degrees: Record<string, Float64Array> = {};
  study.arms.forEach(({ network }, a) => {
    if (!('kind' in network)) return;
    if (network.kind === 'file' && !(network.path in ties)) {
      ties[network.path] = readTies(texts[network.path]!, network.path, ids ?? n);
    }
    if (network.kind === 'configuration' && network.degrees.kind === 'file') {
      const { path, column } = network.degrees;
      degrees[path] = readDegrees(texts[path]!, path, column, n);
    }
    if (network.kind === 'named') {
      const size = sizeOfNamed(parsed, network.name, a);
      if (size !== null && size !== n) {
        throw new InputError({
          code: 'size-mismatch',
          place: parsed.place(['arms', a, 'network', 'name']),
          problem: `the graph '${network.name}' has ${size} households, the study ${n}`,
          remedy: `set population.households: ${size}`,
        });
      }
    }
  });
  return { households, sample, ties, degrees, texts };
}

/** Households of a graph known by name, null when it takes any number. */
function sizeOfNamed(parsed: ParsedStudy, name: string, arm: number): number | null {
  try {
    return namedSize(name);
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    const guess = nearest(name, NAMED_GRAPHS);
    throw new InputError({
      code: 'unknown-value',
      place: parsed.place(['arms', arm, 'network', 'name']),
      problem: `there is no graph named '${name}'`,
      remedy: guess === undefined ? `use one of ${NAMED_GRAPHS.join(', ')}` : `did you mean '${guess}'?`,
    });
  }
}

/** Problems gathered while a table is read; a file with thousands of faults shows the first few. */
class Faults {
  private readonly found: Problem[] = [];
  private count = 0;

  add(problem: Problem): void {
    this.count++;
    if (this.found.length < 20) this.found.push(problem);
  }

  raise(path: string): void {
    if (this.count === 0) return;
    if (this.count > this.found.length) {
      this.found.push({
        code: 'more-problems',
        place: path,
        problem: `${this.count - this.found.length} more problems of this kind`,
        remedy: 'mend these first',
      });
    }
    throw new InputError(this.found);
  }
}

function columnIndex(table: CsvTable, path: string, name: string): number {
  const at = table.header.indexOf(name);
  if (at >= 0) return at;
  const guess = nearest(name, table.header);
  throw new InputError({
    code: 'missing-column',
    place: `${path}:1`,
    problem: `there is no column '${name}' (columns: ${table.header.join(', ')})`,
    remedy: guess === undefined ? `add the column '${name}'` : `did you mean '${guess}'?`,
  });
}

/** A number as files write it, or NaN: no thousands separators, no decimal comma, not empty. */
function numberOf(text: string): number {
  return /^\s*[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?\s*$/.test(text) ? Number(text) : NaN;
}

/**
 * Reads a households file: `household, wealth [, place, group, x_…]`.
 *
 * @throws {InputError} for missing or unknown columns, repeated ids, wealth that is not a number above 0
 */
export function readHouseholds(text: string, path: string): HouseholdsFile {
  const table = readCsv(text, path);
  const faults = new Faults();
  const idAt = columnIndex(table, path, 'household');
  const wealthAt = columnIndex(table, path, 'wealth');
  const known = ['household', 'wealth', 'place', 'group'];
  for (const name of table.header) {
    if (known.includes(name) || /^x_\w/.test(name)) continue;
    const guess = nearest(name, known);
    faults.add({
      code: 'unknown-column',
      place: `${path}:1 column ${name}`,
      problem: `unknown column '${name}'`,
      remedy:
        guess === undefined
          ? `name covariates x_… ('x_${name}'), and leave out names and other identifiers`
          : `did you mean '${guess}'? (covariates are named x_…)`,
    });
  }
  faults.raise(path);

  const n = table.rows.length;
  if (n < 2) {
    throw new InputError({
      code: 'too-few-households',
      place: path,
      problem: `there ${n === 1 ? 'is one household' : 'are no households'}`,
      remedy: 'give at least two',
    });
  }
  const ids: string[] = [];
  const seen = new Map<string, number>();
  const wealth = new Float64Array(n);
  const where = (row: number, column: string): string => `${path} row ${table.lines[row]} column ${column}`;
  for (let i = 0; i < n; i++) {
    const row = table.rows[i]!;
    const id = row[idAt]!.trim();
    const earlier = seen.get(id);
    if (id === '') {
      faults.add({
        code: 'missing-id',
        place: where(i, 'household'),
        problem: 'the id is empty',
        remedy: 'give every household an id',
      });
    } else if (earlier !== undefined) {
      faults.add({
        code: 'duplicate-household',
        place: where(i, 'household'),
        problem: `household '${id}' stands in row ${earlier} too`,
        remedy: 'keep one row a household',
      });
    }
    seen.set(id, table.lines[i]!);
    ids.push(id);
    const value = numberOf(row[wealthAt]!);
    wealth[i] = value;
    if (!(value > 0 && value < 1e200)) {
      faults.add({
        code: 'bad-wealth',
        place: where(i, 'wealth'),
        problem: row[wealthAt]!.trim() === '' ? 'wealth is empty' : `wealth is '${row[wealthAt]}'`,
        remedy: 'give a number above 0, with a point as decimal mark and no separators',
      });
    }
  }
  faults.raise(path);
  const place = coded(table, 'place', null, faults, where);
  const group = coded(table, 'group', 'all', faults, where);
  faults.raise(path);
  return {
    n,
    ids,
    wealth,
    place: place.codes,
    placeNames: place.names,
    group: group.codes,
    groupNames: group.names,
    covariates: table.header.filter((name) => name.startsWith('x_')).map((name) => covariate(table, name)),
  };
}

/** Text labels as numbers, in order of first appearance; one label for all when the column is missing. */
function coded(
  table: CsvTable,
  name: string,
  whenMissing: string | null,
  faults: Faults,
  where: (row: number, column: string) => string,
): { codes: Uint32Array; names: string[] } {
  const at = table.header.indexOf(name);
  const codes = new Uint32Array(table.rows.length);
  if (at < 0) return { codes, names: [whenMissing ?? '0'] };
  const index = new Map<string, number>();
  for (let i = 0; i < codes.length; i++) {
    const label = table.rows[i]![at]!.trim();
    if (label === '') {
      faults.add({
        code: `missing-${name}`,
        place: where(i, name),
        problem: `${name} is empty`,
        remedy: `give every household a ${name}`,
      });
    }
    let code = index.get(label);
    if (code === undefined) {
      code = index.size;
      index.set(label, code);
    }
    codes[i] = code;
  }
  return { codes, names: [...index.keys()] };
}

/** A covariate: numbers when every value that is not empty reads as one, else text. */
function covariate(table: CsvTable, name: string): Covariate {
  const at = table.header.indexOf(name);
  const cells = table.rows.map((row) => row[at]!.trim());
  const numbers = Float64Array.from(cells, (cell) => (cell === '' ? NaN : numberOf(cell)));
  const numeric = cells.every((cell, i) => cell === '' || !Number.isNaN(numbers[i]));
  return { name, values: numeric ? numbers : cells.map((cell) => (cell === '' ? null : cell)) };
}

function checkGroupNames(parsed: ParsedStudy, households: HouseholdsFile): void {
  parsed.study.population.groups?.forEach(({ name }, g) => {
    if (households.groupNames.includes(name)) return;
    const guess = nearest(name, households.groupNames);
    throw new InputError({
      code: 'unknown-group',
      place: parsed.place(['population', 'groups', g, 'name']),
      problem: `no household of the file is in group '${name}'`,
      remedy: guess === undefined ? `use one of ${households.groupNames.join(', ')}` : `did you mean '${guess}'?`,
    });
  });
}

/** Reads a survey column and its weights. @throws {InputError} for values that are not numbers above 0 */
export function readSample(text: string, path: string, column: string, weightColumn: string | undefined): Sample {
  const table = readCsv(text, path);
  const at = columnIndex(table, path, column);
  const weightAt = weightColumn === undefined ? -1 : columnIndex(table, path, weightColumn);
  const faults = new Faults();
  const n = table.rows.length;
  const values = new Float64Array(n);
  const weights = new Float64Array(n).fill(1);
  for (let i = 0; i < n; i++) {
    const row = table.rows[i]!;
    values[i] = numberOf(row[at]!);
    if (!(values[i] > 0 && values[i] < 1e200)) {
      faults.add({
        code: 'bad-wealth',
        place: `${path} row ${table.lines[i]} column ${column}`,
        problem: row[at]!.trim() === '' ? 'the value is empty' : `the value is '${row[at]}'`,
        remedy: 'give a number above 0, or leave the row out',
      });
    }
    if (weightAt < 0) continue;
    weights[i] = numberOf(row[weightAt]!);
    if (!(weights[i] >= 0 && weights[i] < 1e200)) {
      faults.add({
        code: 'bad-weight',
        place: `${path} row ${table.lines[i]} column ${weightColumn}`,
        problem: `the weight is '${row[weightAt]}'`,
        remedy: 'give a number that is 0 or more',
      });
    }
  }
  faults.raise(path);
  const order = Array.from(values, (_, i) => i).sort((a, b) => values[a] - values[b] || a - b);
  let total = 0;
  for (const i of order) total += weights[i];
  if (!(total > 0)) {
    throw new InputError({
      code: 'empty-sample',
      place: path,
      problem: n === 0 ? 'there are no rows' : 'all weights are 0',
      remedy: 'give at least one row with a weight above 0',
    });
  }
  const kept = order.filter((i) => weights[i] > 0);
  const cumulative = new Float64Array(kept.length);
  let sum = 0;
  kept.forEach((i, k) => {
    sum += weights[i];
    cumulative[k] = sum / total;
  });
  cumulative[kept.length - 1] = 1;
  return { values: Float64Array.from(kept, (i) => values[i]), cumulative };
}

/** Reads one degree a household: the named column, or the only one. */
export function readDegrees(text: string, path: string, column: string | undefined, n: number): Float64Array {
  const table = readCsv(text, path);
  if (column === undefined && table.header.length > 1) {
    throw new InputError({
      code: 'missing-column',
      place: `${path}:1`,
      problem: `there are ${table.header.length} columns`,
      remedy: "name the one with the degrees: column: '…'",
    });
  }
  const at = column === undefined ? 0 : columnIndex(table, path, column);
  const faults = new Faults();
  if (table.rows.length !== n) {
    faults.add({
      code: 'degrees-count',
      place: path,
      problem: `${table.rows.length} degrees for ${n} households`,
      remedy: 'give one row a household',
    });
  }
  const out = Float64Array.from(table.rows, (row) => numberOf(row[at]!));
  out.forEach((degree, i) => {
    if (Number.isInteger(degree) && degree >= 0 && degree < n) return;
    faults.add({
      code: 'degrees-value',
      place: `${path} row ${table.lines[i]}`,
      problem: `the degree is '${table.rows[i]![at]}'`,
      remedy: `give whole numbers from 0 to ${n - 1}`,
    });
  });
  faults.raise(path);
  return out;
}
