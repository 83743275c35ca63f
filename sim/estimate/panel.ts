/**
 * A results folder as a source of rows: the panel, with the households' own columns joined by arm, replicate and
 * household. Reads one replicate at a time, and only the columns that are named. Same code in Node and browser.
 */
import { InputError } from '../../network/errors.js';
import type { ReadColumn, Results } from '../results/read.js';
import {
  type Column,
  type Frame,
  type FrameSource,
  frameSource,
  type NumberColumn,
  pick,
  type TextColumn,
} from './frame.js';

/** Columns that say which row of `households` belongs to a row of the panel. */
const KEYS = ['arm', 'replicate', 'household'];

/**
 * The panel of a results folder.
 *
 * @throws {InputError} no-panel when the study kept none
 */
export async function panelSource(results: Results, place: string): Promise<FrameSource> {
  const panel = await results.panel();
  if (panel === null) {
    throw new InputError({
      code: 'no-panel',
      place,
      problem: 'this study kept no panel',
      remedy: 'run it again with keep: {panel: all}',
    });
  }
  const kindsOf = (table: string): Map<string, Column['kind']> =>
    new Map(
      (results.codebook.resources.find((resource) => resource.name === table)?.schema.fields ?? []).map((field) => [
        field.name,
        field.type === 'string' ? 'text' : 'number',
      ]),
    );
  const own = kindsOf('panel');
  const joined = new Map([...kindsOf('households')].filter(([name]) => !own.has(name)));
  let households: Promise<Households> | undefined;
  // a CSV panel can only be read from end to end: once, and all of it
  let whole: Promise<FrameSource> | undefined;
  const fromCsv = async (): Promise<FrameSource> => {
    const data = await panel.read();
    const columns = new Map(data.names.map((name) => [name, asColumn(data.columns[name])]));
    return frameSource({ rows: data.rows, columns }, place);
  };
  const { arms, replicates } = results.manifest;
  return {
    place,
    kinds: new Map([...own, ...joined]),
    arms,
    replicates: keptReplicates(
      panel.groups?.map((group) => group.replicate),
      replicates,
    ),
    seed: results.manifest.seed,
    async read(names, wantedArms, replicate) {
      const extra = names.filter((name) => joined.has(name));
      const columns = new Set(names.filter((name) => own.has(name)));
      if (extra.length > 0) for (const key of KEYS) columns.add(key);
      let rows: number;
      const frame = new Map<string, Column>();
      if (panel.groups === null) {
        whole ??= fromCsv();
        const read = await (await whole).read([...columns], wantedArms, replicate);
        rows = read.rows;
        for (const [name, column] of read.columns) frame.set(name, column);
      } else {
        const data = await panel.read({
          columns: [...columns],
          ...(wantedArms === null ? {} : { arms: wantedArms }),
          ...(replicate === null ? {} : { replicates: [replicate] }),
        });
        rows = data.rows;
        for (const name of columns) frame.set(name, asColumn(data.columns[name]));
      }
      if (extra.length > 0) {
        households ??= loadHouseholds(results, place);
        const table = await households;
        const own = table.match(frame);
        for (const name of extra) frame.set(name, table.column(name, own));
      }
      for (const name of columns) if (!names.includes(name)) frame.delete(name);
      return { rows, columns: frame } satisfies Frame;
    },
  };
}

/** Replicates that the panel has rows of: all of the study, or those it kept. */
function keptReplicates(found: readonly number[] | undefined, all: number): number[] {
  if (found === undefined) return Array.from({ length: all }, (_, r) => r);
  return [...new Set(found)].sort((a, b) => a - b);
}

function asColumn(column: ReadColumn): Column {
  if (column instanceof Float64Array) return { kind: 'number', values: column };
  if (column instanceof Int32Array) {
    const values = new Float64Array(column.length);
    for (let i = 0; i < column.length; i++) values[i] = column[i] < 0 ? NaN : column[i];
    return { kind: 'number', values };
  }
  const codes = new Int32Array(column.codes.length);
  for (let i = 0; i < codes.length; i++) codes[i] = column.codes[i] < column.names.length ? column.codes[i] : -1;
  return { kind: 'text', codes, levels: column.names };
}

interface Households {
  /** Row of `households` for every row of a piece of the panel, −1 when none. */
  match(panel: ReadonlyMap<string, Column>): Int32Array;
  column(name: string, rows: Int32Array): Column;
}

async function loadHouseholds(results: Results, place: string): Promise<Households> {
  const table = await results.table('households');
  if (table === null) {
    throw new InputError({
      code: 'broken-results',
      place,
      problem: 'the codebook names households but the table is not there',
      remedy: 'run the study again',
    });
  }
  const all = new Map(table.names.map((name) => [name, asColumn(table.columns[name])]));
  const keys = (columns: ReadonlyMap<string, Column>) => ({
    arm: columns.get('arm') as TextColumn,
    replicate: (columns.get('replicate') as NumberColumn).values,
    household: (columns.get('household') as NumberColumn).values,
  });
  // arm name, then replicate and household packed into one number
  const index = new Map<string, Map<number, number>>();
  const { arm, replicate, household } = keys(all);
  for (let i = 0; i < table.rows; i++) {
    const name = arm.levels[arm.codes[i]];
    let inner = index.get(name);
    if (inner === undefined) index.set(name, (inner = new Map()));
    inner.set(replicate[i] * 2 ** 31 + household[i], i);
  }
  return {
    match(panel) {
      const own = keys(panel);
      const byArm = own.arm.levels.map((name) => index.get(name));
      return Int32Array.from(
        own.household,
        (id, i) => byArm[own.arm.codes[i]]?.get(own.replicate[i] * 2 ** 31 + id) ?? -1,
      );
    },
    column: (name, rows) => pick(all.get(name) as Column, rows),
  };
}
