/**
 * A results folder as a source for the screen, wherever its files lie: on the network or in memory.
 *
 * The panel is read a row group at a time, only the columns the screen shows, and the last few groups are kept;
 * axis ends come from the footer. Models come from the study file in the folder, by the engine's own compiler.
 */
import type { AsyncBuffer } from 'hyparquet';
import { fromPairs, type Ties } from '../../network/graph.js';
import { isCoded } from '../../sim/results/field.js';
import { type Source as Files, openSource, type Results, type TableData } from '../../sim/results/read.js';
import { compileModel } from '../../sim/study/compile.js';
import { parseStudy } from '../../sim/study/parse.js';
import { bounds, type Group, groupsFor, type OpenTable, openTable, readRange, readRows, type Values } from './rows.js';
import {
  type ArmInfo,
  CAUSE,
  type Cast,
  numbers,
  ROLE,
  type Snapshot,
  type Source,
  type StudyInfo,
  type Table,
  type TableName,
  text,
} from './source.js';

/** Bytes of panel row groups kept. */
const KEEP_BYTES = 200e6;

const TEXTS = new Set(['pocket_role', 'cause', 'group', 'place_name', 'household_id', 'arm']);

/** A column of text as read. */
type Coded = Exclude<Values, Float64Array>;

/** One row group of the panel, read. */
interface ReadGroup {
  readonly rows: number;
  readonly columns: Record<string, Values>;
  /** First row and number of rows by generation. */
  readonly at: ReadonlyMap<number, readonly [number, number]>;
}

/** The study in the folder, without the files it names: enough for models and names. */
function labelled(
  results: Results,
  yaml: string,
  groupsInOrder: readonly string[],
  arms: readonly string[],
): {
  arms: Omit<ArmInfo, 'reached'>[];
  title: string;
  currency: string;
  yearsPerGeneration: number;
  groupNames: readonly string[];
  kept:
    | 'all'
    | 'none'
    | { replicates?: number | undefined; every?: number | undefined; households?: number | undefined };
} {
  const { study } = parseStudy(yaml, 'study.yaml');
  const named = study.population.groups?.map((g) => g.name) ?? ['all'];
  const groupNames = study.population.households_file === undefined ? named : groupsInOrder;
  return {
    title: results.manifest.study,
    currency: study.currency,
    yearsPerGeneration: study.years_per_generation,
    groupNames,
    kept: study.keep.panel,
    arms: arms.map((name) => {
      const arm = study.arms.find((a) => a.name === name);
      if (arm === undefined) throw new Error(`the study has no arm ${name}`);
      return { name, model: compileModel(study, arm, groupNames) };
    }),
  };
}

/** Opens a results folder. @throws {InputError} when it is none, or the run has not finished */
export async function openFolder(files: Files, kind: 'folder' | 'page'): Promise<Source> {
  const results = await openSource(files);
  const { manifest } = results;
  const [yaml, householdTable, indicators] = await Promise.all([
    results.studyYaml(),
    parquet(files, 'households'),
    results.table('indicators'),
  ]);
  const firstArm = manifest.arms[0];
  const first = await householdRows(results, householdTable, firstArm, 0);
  const groupColumn = first.group as { names: readonly string[] };
  const told = labelled(results, yaml, groupColumn.names, manifest.arms);
  const indicatorTable = indicators === null ? null : asTable(indicators);
  const reached = manifest.arms.map((arm) => (indicatorTable === null ? {} : meansAtStart(indicatorTable, arm)));
  const keepsReplicates =
    typeof told.kept === 'object' ? (told.kept.replicates ?? manifest.replicates) : manifest.replicates;
  const shown = told.kept === 'none' ? 0 : Math.min(manifest.replicates, keepsReplicates);
  const every = typeof told.kept === 'object' ? (told.kept.every ?? 1) : 1;
  const info: StudyInfo = {
    title: told.title,
    seed: manifest.seed,
    version: manifest.version,
    currency: told.currency,
    yearsPerGeneration: told.yearsPerGeneration,
    arms: told.arms.map((arm, k) => ({ ...arm, reached: reached[k] })),
    shown: Array.from({ length: shown }, (_, r) => r),
    replicates: manifest.replicates,
    generations: manifest.generations,
    every,
    households: manifest.households,
    groupNames: told.groupNames,
    yaml,
  };
  return new FolderSource(
    files,
    kind,
    results,
    info,
    householdTable,
    await parquet(files, 'panel'),
    await parquet(files, 'ties'),
  );
}

async function parquet(files: Files, name: string): Promise<OpenTable | null> {
  const file: AsyncBuffer | null = await files.open(`${name}.parquet`);
  return file === null ? null : openTable(file);
}

class FolderSource implements Source {
  readonly kind: 'folder' | 'page';
  readonly info: StudyInfo;
  readonly #files: Files;
  readonly #results: Results;
  readonly #households: OpenTable | null;
  readonly #panel: OpenTable | null;
  readonly #ties: OpenTable | null;
  readonly #tables = new Map<TableName, Promise<Table | null>>();
  readonly #groups = new Map<string, { value: Promise<ReadGroup>; bytes: number }>();
  #bytes = 0;
  readonly #casts = new Map<string, Promise<Cast>>();
  readonly #tieRows = new Map<string, Promise<TieRows>>();
  #csvPanel: Promise<TableData | null> | null = null;

  constructor(
    files: Files,
    kind: 'folder' | 'page',
    results: Results,
    info: StudyInfo,
    households: OpenTable | null,
    panel: OpenTable | null,
    ties: OpenTable | null,
  ) {
    this.#files = files;
    this.kind = kind;
    this.#results = results;
    this.info = info;
    this.#households = households;
    this.#panel = panel;
    this.#ties = ties;
  }

  cast(arm: number, replicate: number): Promise<Cast> {
    const key = `${arm}/${replicate}`;
    let cast = this.#casts.get(key);
    if (cast === undefined) {
      cast = this.#readCast(arm, replicate);
      this.#casts.set(key, cast);
      cast.catch(() => this.#casts.delete(key));
      if (this.#casts.size > 12) this.#casts.delete(this.#casts.keys().next().value as string);
    }
    return cast;
  }

  async #readCast(arm: number, replicate: number): Promise<Cast> {
    const columns = await householdRows(this.#results, this.#households, this.info.arms[arm].name, replicate);
    const id = columns.household as Float64Array;
    const groupColumn = columns.group as { codes: Int32Array; names: readonly string[] };
    const { groupNames } = this.info;
    const code = groupColumn.names.map((name) => Math.max(0, groupNames.indexOf(name)));
    const thinned = await this.#thinned(arm, replicate, id.length);
    const pick = thinned ?? Uint32Array.from(id, (_, i) => i);
    const n = pick.length;
    const place = new Uint32Array(n);
    const group = new Uint32Array(n);
    const childWeight = new Float64Array(n);
    const treated = new Uint8Array(n);
    let any = false;
    let places = 1;
    pick.forEach((i, k) => {
      place[k] = (columns.place as Float64Array)[i];
      places = Math.max(places, place[k] + 1);
      group[k] = code[groupColumn.codes[i]] ?? 0;
      childWeight[k] = (columns.child_weight as Float64Array)[i];
      treated[k] = (columns.treated as Float64Array)[i] === 1 ? 1 : 0;
      any ||= treated[k] === 1;
    });
    const named = columns.household_id as Coded | undefined;
    const placed = columns.place_name as Coded | undefined;
    const placeNames = placed === undefined ? null : Array.from({ length: places }, (_, p) => String(p));
    if (placed !== undefined && placeNames !== null)
      pick.forEach((i, k) => {
        placeNames[place[k]] = placed.names[placed.codes[i]] ?? placeNames[place[k]];
      });
    return {
      n,
      id: Uint32Array.from(pick, (i) => id[i]),
      names: named === undefined ? null : Array.from(pick, (i) => named.names[named.codes[i]] ?? String(id[i])),
      placeNames,
      place,
      places,
      group,
      groups: groupNames.length,
      childWeight,
      treated: any ? treated : null,
    };
  }

  /** Households the panel keeps, when it keeps only some. */
  async #thinned(arm: number, replicate: number, n: number): Promise<Uint32Array | null> {
    const rows = await this.#generation(arm, replicate, 0, ['household']);
    if (rows.rows === n) return null;
    return Uint32Array.from(rows.columns.household as Float64Array);
  }

  async ties(arm: number, replicate: number, generation: number): Promise<Ties> {
    const key = `${arm}/${replicate}`;
    let rows = this.#tieRows.get(key);
    if (rows === undefined) {
      rows = this.#readTies(arm, replicate);
      this.#tieRows.set(key, rows);
      rows.catch(() => this.#tieRows.delete(key));
      if (this.#tieRows.size > 6) this.#tieRows.delete(this.#tieRows.keys().next().value as string);
    }
    return (await rows).at(generation);
  }

  async #readTies(arm: number, replicate: number): Promise<TieRows> {
    const names = ['from_generation', 'to_generation', 'source', 'target', 'weight'];
    const cast = await this.cast(arm, replicate);
    const columns =
      this.#ties !== null
        ? (await readRows(this.#ties, this.info.arms[arm].name, replicate, names, TEXTS)).columns
        : pickRows(await this.#results.table('ties'), this.info.arms[arm].name, replicate, names);
    return new TieRows(cast, columns as Record<string, Float64Array>);
  }

  async snapshot(arm: number, replicate: number, generation: number): Promise<Snapshot> {
    const { info } = this;
    const cast = await this.cast(arm, replicate);
    const n = cast.n;
    const model = info.arms[arm].model;
    if (generation >= info.generations) {
      const last = await this.#generation(arm, replicate, info.generations - 1, ['child_wealth']);
      const blank = new Uint8Array(n);
      const wealth = last.columns.child_wealth as Float64Array;
      return {
        generation,
        decided: false,
        wealth,
        aspirations: model.milestones.map(() => new Float64Array(n)),
        planned: new Float64Array(n),
        childWealth: new Float64Array(n),
        met: blank,
        isolated: blank,
        pocket: new Int32Array(n).fill(-1),
        role: blank,
        cause: blank,
        sheltered: blank,
        complacent: blank,
      };
    }
    const { columns } = await this.#generation(arm, replicate, generation, null);
    const number = (name: string): Float64Array => (columns[name] as Float64Array | undefined) ?? new Float64Array(n);
    const flags = (name: string): Uint8Array => {
      const v = columns[name] as Float64Array | undefined;
      const out = new Uint8Array(n);
      if (v !== undefined) for (let i = 0; i < n; i++) out[i] = v[i] > 0 ? v[i] : 0;
      return out;
    };
    const pocketValues = columns.pocket as Float64Array | undefined;
    const coded = (name: string, means: Readonly<Record<string, number>>): Uint8Array => {
      const v = columns[name] as { codes: Int32Array; names: readonly string[] } | undefined;
      const out = new Uint8Array(n);
      if (v === undefined) return out;
      const to = v.names.map((text) => means[text] ?? 0);
      for (let i = 0; i < n; i++) out[i] = v.codes[i] < 0 ? 0 : to[v.codes[i]];
      return out;
    };
    return {
      generation,
      decided: true,
      wealth: number('wealth'),
      aspirations: model.milestones.map((_, m) => number(`aspiration_${m + 1}`)),
      planned: number('planned_child_wealth'),
      childWealth: number('child_wealth'),
      met: flags('milestones_met'),
      isolated: flags('isolated'),
      pocket: Int32Array.from({ length: n }, (_, i) =>
        pocketValues === undefined || Number.isNaN(pocketValues[i]) ? -1 : pocketValues[i],
      ),
      role: coded('pocket_role', { fringe: ROLE.fringe, core: ROLE.core }),
      cause: coded('cause', { local: CAUSE.local, general: CAUSE.general }),
      sheltered: flags('sheltered'),
      complacent: flags('complacent'),
    };
  }

  async extents(arm: number, replicate: number): Promise<Float64Array> {
    const { generations } = this.info;
    const out = new Float64Array(2 * (generations + 1)).fill(NaN);
    const put = (t: number, low: number, high: number): void => {
      out[2 * t] = low;
      out[2 * t + 1] = high;
    };
    const scan = async (t: number): Promise<void> => {
      const s = await this.snapshot(arm, replicate, t);
      put(t, least(s.wealth), most(s.wealth));
      if (t === generations - 1) put(generations, least(s.childWealth), most(s.childWealth));
    };
    if (this.#panel === null) {
      for (let t = 0; t < generations; t += this.info.every) await scan(t);
      return out;
    }
    for (const { group } of this.#panelGroups(arm, replicate)) {
      const t = bounds(group, 'generation');
      const wealth = bounds(group, 'wealth');
      const child = bounds(group, 'child_wealth');
      if (t === null) continue;
      if (Number(t[0]) === Number(t[1]) && wealth !== null) {
        put(Number(t[0]), Number(wealth[0]), Number(wealth[1]));
        if (Number(t[0]) === generations - 1 && child !== null) put(generations, Number(child[0]), Number(child[1]));
      } else {
        // several small generations in one group: it is read whole for the first of them anyway
        for (let g = Number(t[0]); g <= Number(t[1]); g += this.info.every) await scan(g);
      }
    }
    return out;
  }

  table(name: TableName): Promise<Table | null> {
    let table = this.#tables.get(name);
    if (table === undefined) {
      table = this.#results.table(name).then((data) => (data === null ? null : asTable(data)));
      this.#tables.set(name, table);
      table.catch(() => this.#tables.delete(name));
    }
    return table;
  }

  async files(): Promise<readonly string[]> {
    return [...this.#results.manifest.files.map((f) => f.name), 'manifest.json'];
  }

  async file(name: string): Promise<Uint8Array> {
    const found = await this.#files.open(name);
    if (found === null) throw new Error(`there is no ${name} in the results`);
    return new Uint8Array(await found.slice(0, found.byteLength));
  }

  close(): void {
    this.#groups.clear();
    this.#casts.clear();
    this.#tieRows.clear();
  }

  #panelGroups(arm: number, replicate: number): Group[] {
    return this.#panel === null ? [] : groupsFor(this.#panel, this.info.arms[arm].name, replicate);
  }

  /** Columns the screen shows of the panel, as far as it has them. */
  #shownColumns(arm: number): string[] {
    const all = [
      'generation',
      'household',
      'wealth',
      ...this.info.arms[arm].model.milestones.map((_, m) => `aspiration_${m + 1}`),
      'planned_child_wealth',
      'child_wealth',
      'milestones_met',
      'isolated',
      'pocket',
      'pocket_role',
      'cause',
      'sheltered',
      'complacent',
    ];
    const panel = this.#panel;
    return panel === null ? all : all.filter((name) => panel.names.has(name));
  }

  /** Rows of one generation; `names` null = all shown columns. */
  async #generation(
    arm: number,
    replicate: number,
    generation: number,
    names: readonly string[] | null,
  ): Promise<{ rows: number; columns: Record<string, Values> }> {
    const panel = this.#panel;
    if (panel === null) return this.#csvGeneration(arm, replicate, generation);
    for (const group of this.#panelGroups(arm, replicate)) {
      const t = bounds(group.group, 'generation');
      if (t === null || Number(t[0]) > generation || Number(t[1]) < generation) continue;
      const read = await this.#readGroup(arm, group);
      const span = read.at.get(generation);
      if (span === undefined) break;
      const [from, rows] = span;
      const columns: Record<string, Values> = {};
      for (const name of names ?? Object.keys(read.columns)) {
        const v = read.columns[name];
        if (v === undefined) continue;
        columns[name] =
          v instanceof Float64Array
            ? v.subarray(from, from + rows)
            : { codes: v.codes.subarray(from, from + rows), names: v.names };
      }
      return { rows, columns };
    }
    throw new Error(`the panel does not hold generation ${generation} of replicate ${replicate + 1}`);
  }

  #readGroup(arm: number, group: Group): Promise<ReadGroup> {
    const key = String(group.from);
    const kept = this.#groups.get(key);
    if (kept !== undefined) {
      this.#groups.delete(key);
      this.#groups.set(key, kept);
      return kept.value;
    }
    const names = this.#shownColumns(arm);
    const entry = {
      value: readRange(this.#panel as OpenTable, group.from, group.rows, names, TEXTS).then((columns): ReadGroup => {
        const generation = columns.generation as Float64Array;
        const at = new Map<number, readonly [number, number]>();
        for (let k = 0; k < group.rows; ) {
          let end = k;
          while (end < group.rows && generation[end] === generation[k]) end++;
          at.set(generation[k], [k, end - k]);
          k = end;
        }
        return { rows: group.rows, columns, at };
      }),
      bytes: group.rows * names.length * 8,
    };
    this.#groups.set(key, entry);
    this.#bytes += entry.bytes;
    entry.value.catch(() => this.#groups.delete(key));
    for (const [k, old] of this.#groups) {
      if (this.#bytes <= KEEP_BYTES || k === key) break;
      this.#bytes -= old.bytes;
      this.#groups.delete(k);
    }
    return entry.value;
  }

  /** A panel that was kept as CSV only is read whole, once. */
  async #csvGeneration(
    arm: number,
    replicate: number,
    generation: number,
  ): Promise<{ rows: number; columns: Record<string, Values> }> {
    this.#csvPanel ??= this.#results.panel().then(async (reader) => {
      if (reader === null) return null;
      const wanted = new Set(['arm', 'replicate', ...this.info.arms.flatMap((_, k) => this.#shownColumns(k))]);
      return reader.read({ columns: reader.names.filter((name) => wanted.has(name)) });
    });
    const data = await this.#csvPanel;
    if (data === null) throw new Error('this study kept no panel: there are no households to show');
    const columns = pickRows(data, this.info.arms[arm].name, replicate, null, generation);
    const rows = (columns.household as Float64Array).length;
    if (rows === 0) throw new Error(`the panel does not hold generation ${generation} of replicate ${replicate + 1}`);
    return { rows, columns };
  }
}

/** Ties of one arm and replicate with the generations they stand. */
class TieRows {
  readonly #cast: Cast;
  readonly #columns: Record<string, Float64Array>;
  readonly #made = new Map<string, Ties>();
  readonly #changes: number[];

  constructor(cast: Cast, columns: Record<string, Float64Array>) {
    this.#cast = cast;
    this.#columns = columns;
    const changes = new Set<number>([0]);
    for (const t of columns.from_generation) changes.add(t);
    for (const t of columns.to_generation) changes.add(t + 1);
    this.#changes = [...changes].sort((a, b) => a - b);
  }

  /** The same object for generations between which no tie changes. */
  at(generation: number): Ties {
    const since = this.#changes.filter((t) => t <= generation).at(-1) ?? 0;
    const key = String(since);
    let ties = this.#made.get(key);
    if (ties === undefined) {
      ties = this.#build(generation);
      this.#made.set(key, ties);
    }
    return ties;
  }

  #build(generation: number): Ties {
    const { from_generation: from, to_generation: to, source, target, weight } = this.#columns;
    const { n, id } = this.#cast;
    const largest = id.reduce((a, b) => Math.max(a, b), 0);
    const index = new Int32Array(largest + 1).fill(-1);
    id.forEach((v, k) => {
      index[v] = k;
    });
    const a: number[] = [];
    const b: number[] = [];
    const w: number[] = [];
    let weighted = false;
    for (let e = 0; e < source.length; e++) {
      if (from[e] > generation || to[e] < generation) continue;
      const i = index[source[e]] ?? -1;
      const j = index[target[e]] ?? -1;
      if (i < 0 || j < 0) continue;
      a.push(i);
      b.push(j);
      w.push(weight[e]);
      weighted ||= weight[e] !== 1;
    }
    return fromPairs(n, Uint32Array.from(a), Uint32Array.from(b), weighted ? Float64Array.from(w) : null);
  }
}

async function householdRows(
  results: Results,
  table: OpenTable | null,
  arm: string,
  replicate: number,
): Promise<Record<string, Values>> {
  const all = ['household', 'place', 'group', 'child_weight', 'treated', 'household_id', 'place_name'];
  const names = table === null ? all : all.filter((name) => table.names.has(name));
  if (table !== null) return (await readRows(table, arm, replicate, names, TEXTS)).columns;
  return pickRows(await results.table('households'), arm, replicate, names);
}

/** Rows of an arm, replicate (and generation) out of a table read whole. */
function pickRows(
  data: TableData | null,
  arm: string,
  replicate: number,
  names: readonly string[] | null,
  generation: number | null = null,
): Record<string, Values> {
  if (data === null) throw new Error('a table of the results is missing');
  const armColumn = data.columns.arm;
  const rep = data.columns.replicate as Int32Array;
  const gen = data.columns.generation as Int32Array;
  if (!isCoded(armColumn)) throw new Error('the arm column holds no text');
  const keep: number[] = [];
  for (let k = 0; k < data.rows; k++) {
    if (rep[k] !== replicate || armColumn.names[armColumn.codes[k]] !== arm) continue;
    if (generation === null || gen[k] === generation) keep.push(k);
  }
  const out: Record<string, Values> = {};
  for (const name of names ?? data.names) {
    const column = data.columns[name];
    if (column === undefined) continue;
    if (isCoded(column))
      out[name] = {
        codes: Int32Array.from(keep, (k) => (column.codes[k] < column.names.length ? column.codes[k] : -1)),
        names: column.names,
      };
    else {
      const whole = !(column instanceof Float64Array);
      out[name] = Float64Array.from(keep, (k) => (whole && column[k] < 0 ? NaN : column[k]));
    }
  }
  return out;
}

function asTable(data: TableData): Table {
  const columns: Record<string, readonly string[] | Float64Array> = {};
  for (const name of data.names) {
    const column = data.columns[name];
    if (isCoded(column)) columns[name] = Array.from(column.codes, (c) => column.names[c] ?? '');
    else if (column instanceof Float64Array) columns[name] = column;
    // an empty integer is any negative one
    else columns[name] = Float64Array.from(column, (v) => (v < 0 ? NaN : v));
  }
  return { rows: data.rows, columns };
}

function meansAtStart(table: Table, arm: string): Record<string, number> {
  const arms = text(table, 'arm');
  const generation = numbers(table, 'generation');
  const out: Record<string, number> = {};
  for (const name of Object.keys(table.columns)) {
    const column = table.columns[name];
    if (!(column instanceof Float64Array)) continue;
    let sum = 0;
    let count = 0;
    for (let k = 0; k < table.rows; k++) {
      if (arms[k] !== arm || generation[k] !== 0 || Number.isNaN(column[k])) continue;
      sum += column[k];
      count++;
    }
    if (count > 0) out[name] = sum / count;
  }
  return out;
}

function least(values: Float64Array): number {
  let v = Infinity;
  for (let i = 0; i < values.length; i++) if (values[i] < v && values[i] > 0) v = values[i];
  return v;
}

function most(values: Float64Array): number {
  let v = -Infinity;
  for (let i = 0; i < values.length; i++) if (values[i] > v) v = values[i];
  return v;
}
