/**
 * Everything the report says, gathered once: the study, the tables, and the households of one replicate.
 *
 * Of the panel and the ties it reads the row groups of one replicate, and of those the columns it draws, so that a
 * folder of any size can be reported.
 */
import { ladder } from '../../../network/arrange/ladder.js';
import { map } from '../../../network/arrange/map.js';
import { fromPairs, type Ties } from '../../../network/graph.js';
import { stream } from '../../random/stream.js';
import type { Study } from '../../study/complete.js';
import { parseStudy } from '../../study/parse.js';
import { type Answer, answerOf } from '../answer.js';
import { contrastRow } from '../contrasts.js';
import { IndicatorCube } from '../cube.js';
import type { Coded } from '../field.js';
import type { Manifest } from '../manifest.js';
import { type PocketStepRow, type PocketSummary, pocketSummary } from '../pocket-summary.js';
import type { PanelQuery, ReadColumn, Results, TableData } from '../read.js';
import { type EstimatesFile, parseEstimates } from './estimates.js';

/** Most households laid out on a map: beyond, the layout takes minutes and the marks are a smear. */
export const MAP_LIMIT = 10_000;

/** Households of one arm in one generation of the replicate shown. */
export interface Moment {
  readonly generation: number;
  readonly household: Int32Array;
  readonly wealth: Float64Array;
  /** Milestones met. */
  readonly met: Uint8Array;
  /** Ties of all households, or null where the network was not drawn. */
  readonly ties: Ties | null;
}

/** One arm of the replicate shown. */
export interface ArmShown {
  readonly name: string;
  readonly moments: readonly Moment[];
  /** Place and group of every household of the study. */
  readonly place: Int32Array;
  readonly group: Coded;
  /** Drawn positions of every household, or null where there are too many. */
  readonly positions: Float32Array | null;
  /** Place on the ladder of every household; null when the panel is thinned. */
  readonly sideways: Float32Array | null;
}

/** The replicate that is drawn household by household. */
export interface Shown {
  readonly replicate: number;
  readonly arms: readonly ArmShown[];
}

export interface Evidence {
  readonly manifest: Manifest;
  readonly study: Study;
  /** What the run noted on its networks, by arm, one a replicate. */
  readonly networks: Readonly<Record<string, readonly NetworkNote[]>>;
  readonly cube: IndicatorCube;
  /** Names and meanings of the indicators, from the codebook. */
  readonly meanings: ReadonlyMap<string, string>;
  readonly answer: Answer;
  /** The start, the generation in which the arms differ most, the last decision; fewer in short studies. */
  readonly moments: readonly number[];
  /** The middle one of `moments`. */
  readonly telling: number;
  readonly incidence: Rows;
  readonly transitions: Rows;
  readonly frustration: Rows;
  readonly pockets: Rows;
  readonly regimes: Rows;
  /** Null when the study kept no panel. */
  readonly shown: Shown | null;
  readonly estimates: EstimatesFile | null;
}

/** A network as the run noted it. */
export interface NetworkNote {
  readonly kind: string;
  readonly asked: Readonly<Record<string, unknown>>;
  readonly reached: Readonly<Record<string, number>>;
  readonly mixing?: { readonly target: string; readonly asked: number; readonly reached: number };
}

/** A small table, cell by cell. */
export class Rows {
  readonly count: number;
  private readonly columns: Readonly<Record<string, ReadColumn>>;

  constructor(table: TableData | null) {
    this.count = table?.rows ?? 0;
    this.columns = table?.columns ?? {};
  }

  has(name: string): boolean {
    return name in this.columns;
  }

  /** NaN where empty. */
  number(name: string, row: number): number {
    const column = this.columns[name];
    if (column === undefined || 'codes' in column) return NaN;
    const value = column[row];
    return column instanceof Int32Array && value < 0 ? NaN : value;
  }

  text(name: string, row: number): string {
    const column = this.columns[name];
    return column !== undefined && 'codes' in column ? (column.names[column.codes[row]] ?? '') : '';
  }
}

/**
 * Reads what the report needs.
 *
 * @param notes - the run's notes when the manifest does not hold them yet
 */
export async function gather(results: Results, notes?: Readonly<Record<string, unknown>>): Promise<Evidence> {
  const { manifest, codebook } = results;
  const { study } = parseStudy(await results.studyYaml(), 'study.yaml');
  const indicators = await results.table('indicators');
  if (indicators === null) throw new Error('a results folder without indicators');
  const cube = IndicatorCube.of(indicators);
  const fields = codebook.resources.find((resource) => resource.name === 'indicators')?.schema.fields ?? [];
  const moments = momentsOf(cube, study.generations);
  const rows = async (name: string): Promise<Rows> => new Rows(await results.table(name));
  const pockets = await rows('pockets');
  return {
    manifest,
    study,
    networks: ((notes ?? manifest.notes)?.networks ?? {}) as Evidence['networks'],
    cube,
    meanings: new Map(fields.map((field) => [field.name, field.description])),
    answer: answerOf(study, cube, livesOf(pockets, study, cube.replicates)),
    moments,
    telling: moments[Math.floor(moments.length / 2)],
    incidence: await rows('incidence'),
    transitions: await rows('transitions'),
    frustration: await rows('frustration'),
    pockets,
    regimes: await rows('regimes'),
    shown: await showReplicate(results, study, cube, moments),
    estimates: parseEstimates(await results.text('estimates.json')),
  };
}

/** Lives of the pockets of each arm; none where no pocket was looked for. */
function livesOf(pockets: Rows, study: Study, replicates: number): PocketSummary[] {
  if (pockets.count === 0) return [];
  const rows = new Map<string, PocketStepRow[]>(study.arms.map((arm) => [arm.name, []]));
  for (let k = 0; k < pockets.count; k++) {
    rows.get(pockets.text('arm', k))?.push({
      replicate: pockets.number('replicate', k),
      generation: pockets.number('generation', k),
      pocket: pockets.number('pocket', k),
      size: pockets.number('size', k),
      places: pockets.number('places', k),
      pValue: pockets.number('p_value', k),
      local: pockets.number('local', k),
      general: pockets.number('general', k),
    });
  }
  return [...rows.values()].map((own) => pocketSummary(own, replicates));
}

/** Start, most telling generation, last decision. */
function momentsOf(cube: IndicatorCube, generations: number): number[] {
  const last = generations - 1;
  if (last < 2) return [...new Set([0, last])];
  let best = Math.floor(last / 2);
  let most = { sure: 0, size: 0 };
  for (let t = 1; t < last; t++) {
    const here = largestDifference(cube, t);
    if (here.sure > most.sure || (here.sure === most.sure && here.size > most.size)) {
      most = here;
      best = t;
    }
  }
  return [0, best, last];
}

/**
 * Largest difference in frustration between the first arm and another; with one arm, frustration itself. `sure` counts
 * only what can be told from none.
 */
function largestDifference(cube: IndicatorCube, generation: number): { sure: number; size: number } {
  if (cube.arms.length === 1) return { sure: 0, size: cube.mean('share_frustrated', 0, generation) };
  let sure = 0;
  let size = 0;
  for (let a = 1; a < cube.arms.length; a++) {
    const row = contrastRow(cube, a, 0, 'share_frustrated', generation);
    if (row === null) continue;
    size = Math.max(size, Math.abs(row.difference));
    if (row.ci_low > 0 || row.ci_high < 0) sure = Math.max(sure, Math.abs(row.difference));
  }
  return { sure, size };
}

/** Of the replicates with a panel, the one whose difference between the arms is nearest to the mean one. */
function typicalReplicate(cube: IndicatorCube, kept: readonly number[], generation: number): number {
  const b = Math.min(1, cube.arms.length - 1);
  const first = cube.over('share_frustrated', 0, generation);
  const other = cube.over('share_frustrated', b, generation);
  const value = (r: number): number => (b === 0 ? first[r] : other[r] - first[r]);
  let sum = 0;
  for (let r = 0; r < cube.replicates; r++) sum += value(r);
  const mean = sum / cube.replicates;
  let best = kept[0];
  for (const r of kept) if (Math.abs(value(r) - mean) < Math.abs(value(best) - mean)) best = r;
  return best;
}

async function showReplicate(
  results: Results,
  study: Study,
  cube: IndicatorCube,
  wanted: readonly number[],
): Promise<Shown | null> {
  const panel = await results.panel();
  const [households, ties] = await Promise.all([results.pieces('households'), results.pieces('ties')]);
  if (panel === null || households === null || ties === null) return null;
  const { panel: keep } = study.keep;
  const every = typeof keep === 'object' ? (keep.every ?? 1) : 1;
  const most = typeof keep === 'object' ? (keep.replicates ?? cube.replicates) : cube.replicates;
  const kept = Array.from({ length: Math.min(most, cube.replicates) }, (_, r) => r);
  const replicate = typicalReplicate(cube, kept, wanted[Math.floor(wanted.length / 2)]);
  // a thinned panel lacks some generations: the kept one before stands in
  const generations = [...new Set(wanted.map((t) => t - (t % every)))];
  const arms: ArmShown[] = [];
  for (const { name } of study.arms) {
    const query: PanelQuery = { arms: [name], replicates: [replicate] };
    const who = await households.read({ ...query, columns: ['household', 'place', 'group'] });
    if (who.rows === 0) return null;
    const n = who.rows;
    const drawn = n <= MAP_LIMIT;
    const spans = drawn
      ? await ties.read({ ...query, columns: ['source', 'target', 'from_generation', 'to_generation'] })
      : null;
    const graphs = new Map<string, Ties>();
    const moments: Moment[] = [];
    for (const generation of generations) {
      const rows = await panel.read({
        ...query,
        generations: [generation, generation],
        columns: ['household', 'wealth', 'milestones_met'],
      });
      moments.push({
        generation,
        household: rows.columns.household as Int32Array,
        wealth: rows.columns.wealth as Float64Array,
        met: Uint8Array.from(rows.columns.milestones_met as Int32Array),
        ties: spans === null ? null : tiesAt(n, spans, generation, graphs),
      });
    }
    const first = moments[0].ties;
    const place = who.columns.place as Int32Array;
    const group = who.columns.group as Coded;
    const { wealth } = moments[0];
    arms.push({
      name,
      moments,
      place,
      group,
      sideways:
        wealth.length < n
          ? null
          : ladder(first ?? untied(n), {
              n,
              place: Uint32Array.from(place),
              group: Uint32Array.from(group.codes),
              wealth,
            }).sideways,
      positions: first === null ? null : map(first, stream(study.seed, replicate, `report map:${name}`)),
    });
  }
  return { replicate, arms };
}

/** A ladder needs ties for the order within a place only: with very many households that is not seen. */
function untied(n: number): Ties {
  return { n, start: new Uint32Array(n + 1), target: new Uint32Array(0), weight: null };
}

/** The ties of one generation; the same object for generations with the same ties. */
function tiesAt(n: number, spans: TableData, generation: number, known: Map<string, Ties>): Ties {
  const [source, target, from, to] = ['source', 'target', 'from_generation', 'to_generation'].map(
    (name) => spans.columns[name] as Int32Array,
  );
  const stands: number[] = [];
  let sum = 0;
  for (let e = 0; e < spans.rows; e++) {
    if (from[e] > generation || to[e] < generation) continue;
    stands.push(e);
    sum = (Math.imul(sum, 31) + e) | 0;
  }
  const key = `${stands.length} ${sum}`;
  let graph = known.get(key);
  if (graph === undefined) {
    graph = fromPairs(
      n,
      Uint32Array.from(stands, (e) => source[e]),
      Uint32Array.from(stands, (e) => target[e]),
      null,
    );
    known.set(key, graph);
  }
  return graph;
}
