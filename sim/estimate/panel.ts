/**
 * A results folder as a source of rows: the panel, with the households' own columns joined by arm, replicate and
 * household. Reads one replicate at a time, and only the columns that are named. Same code in Node and browser.
 */
import { InputError } from '../../network/errors.js';
import type { ReadColumn, Results, TableData } from '../results/read.js';
import type { Column, Frame, FrameSource } from './frame.js';

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
      const data = await panel.read({
        columns: [...columns],
        ...(wantedArms === null ? {} : { arms: wantedArms }),
        ...(replicate === null ? {} : { replicates: [replicate] }),
      });
      const frame = new Map<string, Column>();
      for (const name of columns) if (names.includes(name)) frame.set(name, asColumn(data.columns[name]));
      if (extra.length > 0) {
        households ??= loadHouseholds(results, place);
        const table = await households;
        const rows = table.match(data);
        for (const name of extra) frame.set(name, table.column(name, rows));
      }
      return { rows: data.rows, columns: frame } satisfies Frame;
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
  match(panel: TableData): Int32Array;
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
  const key = (data: TableData) => {
    const arm = data.columns['arm'] as Exclude<ReadColumn, Float64Array | Int32Array>;
    const replicate = data.columns['replicate'] as Int32Array;
    const household = data.columns['household'] as Int32Array;
    return { arm, replicate, household };
  };
  // arm name, then replicate and household packed into one number
  const index = new Map<string, Map<number, number>>();
  const { arm, replicate, household } = key(table);
  for (let i = 0; i < table.rows; i++) {
    const name = arm.names[arm.codes[i]];
    let inner = index.get(name);
    if (inner === undefined) index.set(name, (inner = new Map()));
    inner.set(replicate[i] * 2 ** 31 + household[i], i);
  }
  return {
    match(panel) {
      const own = key(panel);
      const byArm = own.arm.names.map((name) => index.get(name));
      const rows = new Int32Array(panel.rows);
      for (let i = 0; i < panel.rows; i++) {
        rows[i] = byArm[own.arm.codes[i]]?.get(own.replicate[i] * 2 ** 31 + own.household[i]) ?? -1;
      }
      return rows;
    },
    column(name, rows) {
      const source = asColumn(table.columns[name]);
      if (source.kind === 'number') {
        const values = new Float64Array(rows.length);
        for (let i = 0; i < rows.length; i++) values[i] = rows[i] < 0 ? NaN : source.values[rows[i]];
        return { kind: 'number', values };
      }
      const codes = new Int32Array(rows.length);
      for (let i = 0; i < rows.length; i++) codes[i] = rows[i] < 0 ? -1 : source.codes[rows[i]];
      return { kind: 'text', codes, levels: source.levels };
    },
  };
}
