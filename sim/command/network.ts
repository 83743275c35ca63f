/**
 * `network`: graphs on their own, to and from CSV and GraphML: build one of a kind, mix one, measure one.
 */
import { existsSync, rmSync, writeFileSync } from 'node:fs';
import { type Command, Option } from 'commander';
import { NETWORK_KINDS } from '../../network/build/build.js';
import { reached } from '../../network/build/reached.js';
import { InputError, nearest } from '../../network/errors.js';
import { type CsvTable, readCsv } from '../../network/exchange/csv.js';
import { edgeListText } from '../../network/exchange/edge-list.js';
import { type Column, graphmlText } from '../../network/exchange/graphml.js';
import { readGraph } from '../../network/exchange/read-ties.js';
import { type Labels, type Ties, tieCount } from '../../network/graph.js';
import { networkSummary } from '../../network/measure/summary.js';
import { mix } from '../../network/mix/mix.js';
import { MIX_TARGETS, type MixSpec } from '../../network/mix/spec.js';
import { Draws } from '../random/draws.js';
import { stream } from '../random/stream.js';
import { loadInputs } from '../study/inputs.js';
import { buildNetworks } from '../study/networks.js';
import { parseStudy } from '../study/parse.js';
import { drawPopulation } from '../study/population.js';
import { number, wholeNumber } from './options.js';
import { readText } from './study-files.js';

export function networkCommand(program: Command): void {
  const network = program
    .command('network')
    .summary('build, mix or measure a graph of ties')
    .description('Graphs of ties on their own, to and from CSV (source,target[,weight]) and GraphML.');
  buildCommand(network);
  mixCommand(network);
  measureCommand(network);
}

// ── build ───────────────────────────────────────────────────────────────────────────────────────

interface BuildOptions {
  readonly households: number;
  readonly places: number;
  readonly groups?: string;
  readonly gini: number;
  readonly between: number;
  readonly seed: string;
  readonly set: readonly string[];
  readonly out?: string;
  readonly json?: true;
}

function buildCommand(network: Command): void {
  network
    .command('build')
    .argument('<kind>', NETWORK_KINDS.join(', '))
    .addOption(new Option('--households <n>', 'households').argParser(wholeNumber('--households', 2)).default(1000))
    .addOption(new Option('--places <n>', 'places of equal size').argParser(wholeNumber('--places', 1)).default(1))
    .option('--groups <shares>', 'shares of social groups, such as 0.65,0.35')
    .addOption(
      new Option('--gini <g>', 'Gini of wealth, for kinds that look at it').argParser(number('--gini')).default(0.4),
    )
    .addOption(
      new Option('--between <share>', 'share of log variance between places').argParser(number('--between')).default(0),
    )
    .option('--seed <text>', 'seed', 'network')
    .option('--set <key=value...>', "the kind's own keys, as in a study file, such as mean_degree=10", [])
    .option('--out <file>', 'file to write, .csv or .graphml (default: standard output, as CSV)')
    .option('--json', 'machine-readable summary on standard output')
    .summary('draw households and build a network of a kind')
    .description('Draws households with places, groups and wealth, and builds a network of a kind among them.')
    .addHelpText(
      'after',
      '\nExample:\n  rungsight network build blocks --households 2000 --places 20 --set mean_degree=10 within_place=0.9 --out ties.csv',
    )
    .action((kind: string, options: BuildOptions) => buildNetwork(kind, options));
}

async function buildNetwork(kind: string, options: BuildOptions): Promise<void> {
  const out = checkOut(options.out, options.json);
  const parsed = asCommandLine(() => parseStudy(JSON.stringify(studyFor(kind, options)), 'network build'));
  const inputs = await loadInputs(parsed, async (path) => readText(path, path));
  const prepared = { study: parsed.study, inputs };
  const population = drawPopulation(parsed.study, inputs, new Draws(parsed.study.seed, 0));
  const built = asCommandLine(() => buildNetworks(prepared, population, 0, parsed.study.arms));
  const { ties } = built.get('network')!;
  const { labels, groupNames } = population;
  const columns: Column[] = [
    { name: 'place', values: Float64Array.from(labels.place) },
    { name: 'group', values: Array.from(labels.group, (g) => groupNames[g]!) },
    { name: 'wealth', values: labels.wealth },
  ];
  writeGraph(out, ties, undefined, columns);
  say(options.json, out, { kind, ...reached(ties, labels) });
}

/** A study that stands for the options, so that the keys of a kind are checked where they are defined. */
function studyFor(kind: string, options: BuildOptions): unknown {
  const network: Record<string, unknown> = { kind };
  for (const pair of options.set) {
    const at = pair.indexOf('=');
    if (at < 1) {
      throw new InputError({
        code: 'bad-option',
        place: '--set',
        problem: `'${pair}' is not key=value`,
        remedy: 'write --set mean_degree=10',
      });
    }
    const value = pair.slice(at + 1);
    const path = pair.slice(0, at).split('.');
    let level = network;
    for (const step of path.slice(0, -1)) level = (level[step] ??= {}) as Record<string, unknown>;
    level[path.at(-1)!] = value !== '' && Number.isFinite(Number(value)) ? Number(value) : value;
  }
  const groups = options.groups?.split(',').map((share, g) => ({ name: `group ${g + 1}`, share: Number(share) }));
  return {
    study: 'network',
    seed: options.seed,
    generations: 1,
    population: {
      households: options.households,
      places: options.places,
      ...(groups === undefined ? {} : { groups }),
      wealth: { shape: 'lognormal', mean: 100, gini: options.gini, between_places: options.between },
    },
    technology: { kind: 'linear', gross_return: 2 },
    preferences: { curvature: 0.5, child_weight: 0.5 },
    reference: { milestones: [{ weight: 0, mix: [{ from: 'self', weight: 1 }] }] },
    arms: [{ name: 'network', network }],
  };
}

/** Problems of the study behind the options, told as problems of the options. */
function asCommandLine<T>(work: () => T): T {
  try {
    return work();
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    const options: Record<string, string> = {
      'population.households': '--households',
      'population.places': '--places',
      'population.groups': '--groups',
      'population.wealth.gini': '--gini',
      'population.wealth.between_places': '--between',
      "the groups' shares": '--groups',
      'wealth.between_places': '--between',
    };
    throw new InputError(
      error.problems.map((found) => {
        const option = Object.entries(options).find(([path]) => found.problem.startsWith(path))?.[1];
        const words = found.problem.replaceAll('arms[0].network.', '').replaceAll('arms[0].network', 'the network');
        return { ...found, place: option ?? (/\bkind\b/.test(words) ? 'network build KIND' : '--set'), problem: words };
      }),
    );
  }
}

// ── mix ─────────────────────────────────────────────────────────────────────────────────────────

interface HouseholdOptions {
  readonly households?: string;
  readonly value?: string;
  readonly by?: string;
  readonly seed: string;
  readonly json?: true;
}

interface MixOptions extends HouseholdOptions {
  readonly share?: number;
  readonly target?: string;
  readonly to?: number;
  readonly bestEffort?: true;
  readonly out?: string;
}

function mixCommand(network: Command): void {
  network
    .command('mix')
    .argument('<graph>', 'ties, .csv or .graphml')
    .addOption(new Option('--share <share>', 'share of ties swapped at random').argParser(number('--share')))
    .option('--target <measure>', `swap toward a measure: ${MIX_TARGETS.join(', ')}`)
    .addOption(new Option('--to <value>', 'the value of the target').argParser(number('--to')))
    .option('--best-effort', 'accept the nearest value when the target is out of reach')
    .option('--households <file>', 'CSV with the id in its first column; its households are those of the graph')
    .option('--value <column>', 'column with wealth, for the targets that need it')
    .option('--by <column>', 'column with the group, for e_i_group')
    .option('--seed <text>', 'seed', 'mix')
    .option('--out <file>', 'file to write, .csv or .graphml (default: standard output, as CSV)')
    .option('--json', 'machine-readable summary on standard output')
    .summary('rearrange ties; every household keeps its number of ties')
    .description('Rearranges ties by degree-preserving swaps: a share of them at random, or toward a measure.')
    .addHelpText(
      'after',
      '\nExamples:\n  rungsight network mix ties.csv --share 0.5 --out mixed.csv\n' +
        '  rungsight network mix ties.csv --target economic_connectedness --to 0.95 --households h.csv --value wealth --out mixed.csv',
    )
    .action((graph: string, options: MixOptions) => {
      const out = checkOut(options.out, options.json);
      const spec = mixSpec(options);
      const read = readGraphFile(graph, options);
      const labels: Labels = {
        n: read.ties.n,
        place: new Uint32Array(read.ties.n),
        group: read.by ?? new Uint32Array(read.ties.n),
        wealth: read.value ?? new Float64Array(read.ties.n).fill(1),
      };
      const mixed = asOptions(() => mix(read.ties, spec, labels, stream(options.seed, 0, 'mix')));
      writeGraph(out, mixed.ties, read.ids, read.columns);
      const { ties, ...summary } = mixed;
      say(options.json, out, { households: ties.n, ties: tieCount(ties), ...summary });
    });
}

function mixSpec(options: MixOptions): MixSpec {
  if ((options.share === undefined) === (options.target === undefined)) {
    throw new InputError({
      code: 'options-exclude',
      place: options.share === undefined ? 'network mix' : '--share',
      problem:
        options.share === undefined ? 'neither --share nor --target is given' : '--share and --target are both given',
      remedy: 'give one of them',
    });
  }
  if (options.share !== undefined) return { share: options.share };
  const target = MIX_TARGETS.find((name) => name === options.target);
  if (target === undefined) {
    throw new InputError({
      code: 'unknown-value',
      place: '--target',
      problem: `'${options.target}' is not a measure ties can be mixed toward`,
      remedy: `use one of ${MIX_TARGETS.join(', ')}`,
    });
  }
  if (options.to === undefined) {
    throw new InputError({
      code: 'missing-option',
      place: '--target',
      problem: 'its value is missing',
      remedy: 'add --to VALUE',
    });
  }
  const needed = target === 'e_i_group' ? (['by', '--by'] as const) : (['value', '--value'] as const);
  if (options[needed[0]] === undefined) {
    throw new InputError({
      code: 'missing-option',
      place: '--target',
      problem: `${target} needs a column of the households`,
      remedy: `add --households FILE ${needed[1]} COLUMN`,
    });
  }
  return { target, value: options.to, best_effort: options.bestEffort === true };
}

/** Problems of mixing, told by option. */
function asOptions<T>(work: () => T): T {
  try {
    return work();
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    const option: Record<string, string> = {
      'mixing.share': '--share',
      'mixing.value': '--to',
      'mixing.target': '--target',
    };
    throw new InputError(
      error.problems.map((found) => ({
        ...found,
        place: option[found.place] ?? found.place,
        remedy: found.remedy.replace('best_effort: true', '--best-effort'),
      })),
    );
  }
}

// ── measure ─────────────────────────────────────────────────────────────────────────────────────

function measureCommand(network: Command): void {
  network
    .command('measure')
    .argument('<graph>', 'ties, .csv or .graphml')
    .option('--households <file>', 'CSV with the id in its first column; its households are those of the graph')
    .option('--value <column>', 'a number of each household: assortativity and Moran’s I')
    .option('--by <column>', 'a label of each household: assortativity, modularity, E–I and Coleman indices')
    .addOption(
      new Option('--permutations <n>', 'permutations behind the p-value of Moran’s I')
        .argParser(wholeNumber('--permutations', 0))
        .default(999),
    )
    .option('--seed <text>', 'seed of the permutations', 'measure')
    .option('--json', 'machine-readable result on standard output')
    .summary('measure a graph: size, clustering, assortativity, segregation')
    .description(
      'Measures a graph, with a value and a label of its households where given. Without --households the\nattributes of a GraphML file serve.',
    )
    .addHelpText(
      'after',
      '\nExample:\n  rungsight network measure ties.csv --households h.csv --value wealth --by group',
    )
    .action((graph: string, options: HouseholdOptions & { readonly permutations: number }) => {
      const { ties, value, by } = readGraphFile(graph, options);
      const summary = networkSummary(ties, {
        value: value ?? undefined,
        by: by ?? undefined,
        permutations: options.permutations,
        uniform: stream(options.seed, 0, 'measure'),
      });
      if (options.json) console.log(JSON.stringify(summary, null, 2));
      else
        for (const [key, x] of Object.entries(summary))
          console.log(`${key.padEnd(22)} ${shownNumber(x as number | null)}`);
    });
}

function shownNumber(x: number | null): string {
  if (x === null) return 'not defined';
  return Number.isInteger(x) ? String(x) : String(Number(x.toPrecision(6)));
}

// ── files ───────────────────────────────────────────────────────────────────────────────────────

interface GraphFile {
  readonly ties: Ties;
  readonly ids: readonly string[];
  readonly columns: readonly Column[];
  readonly value: Float64Array | null;
  readonly by: Uint32Array | null;
}

function readGraphFile(path: string, options: HouseholdOptions): GraphFile {
  const table = options.households === undefined ? null : householdTable(options.households);
  const graph = readGraph(readText(path, path), path, table?.ids ?? null);
  const columnOf = (option: string, name: string): readonly string[] => {
    if (table !== null) return table.column(option, name);
    const own = graph.columns.find((column) => column.name === name);
    if (own === undefined) {
      throw new InputError({
        code: 'missing-column',
        place: option,
        problem: `the graph's households have no '${name}'`,
        remedy: 'name the file that has it with --households',
      });
    }
    return Array.from(own.values as ArrayLike<number | string>, (x) => (Number.isNaN(x) ? '' : String(x)));
  };
  return {
    ties: graph.ties,
    ids: graph.ids,
    columns: graph.columns,
    value:
      options.value === undefined
        ? null
        : numbers(columnOf('--value', options.value), options.value, options.households ?? path),
    by: options.by === undefined ? null : codes(columnOf('--by', options.by)),
  };
}

function householdTable(path: string): { ids: string[]; column: (option: string, name: string) => string[] } {
  const table: CsvTable = readCsv(readText(path, path), path);
  const ids = table.rows.map((row) => row[0]!.trim());
  const seen = new Map<string, number>();
  ids.forEach((id, i) => {
    const earlier = seen.get(id);
    if (id === '' || earlier !== undefined) {
      throw new InputError({
        code: id === '' ? 'missing-id' : 'duplicate-household',
        place: `${path} row ${table.lines[i]}`,
        problem: id === '' ? 'the id is empty' : `household '${id}' stands in row ${earlier} too`,
        remedy: id === '' ? 'give every household an id' : 'keep one row a household',
      });
    }
    seen.set(id, table.lines[i]!);
  });
  return {
    ids,
    column: (option, name) => {
      const at = table.header.indexOf(name);
      if (at < 0) {
        const guess = nearest(name, table.header);
        throw new InputError({
          code: 'missing-column',
          place: option,
          problem: `${path} has no column '${name}'`,
          remedy: guess === undefined ? `use one of ${table.header.join(', ')}` : `did you mean '${guess}'?`,
        });
      }
      return table.rows.map((row) => row[at]!.trim());
    },
  };
}

/** Numbers; an empty cell is a value that is not known. */
function numbers(cells: readonly string[], name: string, place: string): Float64Array {
  return Float64Array.from(cells, (cell, i) => {
    if (cell === '' || cell === 'NA') return NaN;
    const x = Number(cell);
    if (Number.isFinite(x)) return x;
    throw new InputError({
      code: 'bad-number',
      place: `${place} row ${i + 2} column ${name}`,
      problem: `'${cell}' is not a number`,
      remedy: 'give numbers with a point as decimal mark, or leave the cell empty',
    });
  });
}

function codes(cells: readonly string[]): Uint32Array {
  const index = new Map<string, number>();
  return Uint32Array.from(cells, (cell) => {
    let code = index.get(cell);
    if (code === undefined) index.set(cell, (code = index.size));
    return code;
  });
}

/** Checks where a graph would go before any work is done. */
function checkOut(out: string | undefined, json: true | undefined): string | null {
  if (out === undefined) {
    if (json) {
      throw new InputError({
        code: 'missing-option',
        place: '--json',
        problem: 'the ties and the summary cannot both go to standard output',
        remedy: 'add --out FILE',
      });
    }
    return null;
  }
  if (!/\.(csv|graphml)$/i.test(out)) {
    throw new InputError({
      code: 'unknown-format',
      place: '--out',
      problem: `'${out}' ends in neither .csv nor .graphml`,
      remedy: 'name a file of one of these kinds',
    });
  }
  if (existsSync(out)) {
    throw new InputError({
      code: 'file-exists',
      place: out,
      problem: 'this file exists and would be overwritten',
      remedy: 'move it away, or name another',
    });
  }
  return out;
}

function writeGraph(
  out: string | null,
  ties: Ties,
  ids: readonly string[] | undefined,
  columns: readonly Column[],
): void {
  const text = out !== null && /\.graphml$/i.test(out) ? graphmlText(ties, ids, columns) : edgeListText(ties, ids);
  if (out === null) {
    for (const piece of text) process.stdout.write(piece);
    return;
  }
  try {
    writeFileSync(out, '', { flag: 'wx' });
    for (const piece of text) writeFileSync(out, piece, { flag: 'a' });
  } catch (error) {
    rmSync(out, { force: true });
    throw new InputError({
      code: 'cannot-write',
      place: out,
      problem: `the file cannot be written (${(error as NodeJS.ErrnoException).code ?? 'unknown reason'})`,
      remedy: 'check the folder and the space on the disk',
    });
  }
}

function say(json: true | undefined, out: string | null, summary: object): void {
  if (json) {
    console.log(JSON.stringify({ out, ...summary }, null, 2));
    return;
  }
  const words = Object.entries(summary)
    .filter(([, value]) => value !== null && value !== undefined)
    .map(([key, value]) => `${key} ${typeof value === 'number' ? shownNumber(value) : value}`);
  console.error(`${out === null ? '' : `Wrote ${out}: `}${words.join(', ')}`);
}
