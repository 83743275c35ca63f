/**
 * The tables that need all replicates: contrasts, growth incidence, transitions, and the answer.
 *
 * Reads the parts of a store, disk or memory, so the command line and the browser make the same bytes.
 */
import { PERCENTILES } from '../measure/incidence.js';
import type { Study } from '../study/complete.js';
import { type Answer, answerOf } from './answer.js';
import { keptBytes } from './assemble.js';
import { contrastRows } from './contrasts.js';
import { IndicatorCube } from './cube.js';
import type { Facts } from './facts.js';
import type { Row } from './field.js';
import { FIFTHS } from './measured.js';
import { partName } from './parts.js';
import { decodePlane } from './plane.js';
import { type PocketStepRow, type PocketSummary, pocketSummary } from './pocket-summary.js';
import { CsvReader } from './read-csv.js';
import { readAll, type Store } from './store.js';
import { type TableName, tableNamed, tablesOf } from './tables.js';

/** Tables computed at the end, and what the run wants on record. */
export interface Finished {
  readonly tables: readonly { readonly name: TableName; readonly rows: readonly Row[] }[];
  readonly answer: Answer;
  readonly notes: Readonly<Record<string, unknown>>;
}

/** @param store - holds the parts of every replicate of the study */
export function finishTables(store: Store, facts: Facts, study: Study): Finished {
  const cube = cubeOfParts(store, facts, study);
  return {
    tables: [
      { name: 'contrasts', rows: contrastRows(cube) as unknown as Row[] },
      { name: 'incidence', rows: incidenceRows(store, study) },
      { name: 'transitions', rows: transitionRows(store, study) },
    ],
    answer: answerOf(study, cube, livesOf(store, facts, study)),
    notes: { networks: networkNotes(store, study) },
  };
}

/** Every indicator of every replicate. */
function cubeOfParts(store: Store, facts: Facts, study: Study): IndicatorCube {
  const names = facts.indicators.map((entry) => entry.name);
  const cube = IndicatorCube.empty(
    study.arms.map((arm) => arm.name),
    study.replicates,
    study.generations + 1,
    names,
  );
  const decoder = new TextDecoder();
  for (let a = 0; a < study.arms.length; a++) {
    for (let r = 0; r < study.replicates; r++) {
      const reader = new CsvReader((cells) => {
        const generation = Number(cells[2]);
        names.forEach((name, k) => {
          const cell = cells[3 + k]!;
          cube.set(name, a, r, generation, cell === '' ? NaN : Number(cell));
        });
      });
      reader.push(decoder.decode(readAll(store, partName(r, a, 'indicators.csv'))!));
      reader.end();
    }
  }
  return cube;
}

/** The pockets of each arm. */
function livesOf(store: Store, facts: Facts, study: Study): PocketSummary[] {
  const fields = tableNamed(tablesOf(facts), 'pockets').fields.map((field) => field.name);
  const at = (name: string): number => fields.indexOf(name);
  const [generation, pocket, size, places, p, local, general] = [
    'generation',
    'pocket',
    'size',
    'places',
    'p_value',
    'local',
    'general',
  ].map(at) as [number, number, number, number, number, number, number];
  const decoder = new TextDecoder();
  return study.arms.map((_, a) => {
    const rows: PocketStepRow[] = [];
    for (let r = 0; r < study.replicates; r++) {
      const reader = new CsvReader((cells) => {
        const value = (k: number): number => (cells[k] === '' ? NaN : Number(cells[k]));
        rows.push({
          replicate: r,
          generation: value(generation),
          pocket: value(pocket),
          size: value(size),
          places: value(places),
          pValue: value(p),
          local: value(local),
          general: value(general),
        });
      });
      reader.push(decoder.decode(readAll(store, partName(r, a, 'pockets.csv'))!));
      reader.end();
    }
    return pocketSummary(rows, study.replicates);
  });
}

/** Mean and Monte Carlo standard error over replicates, those without a value left out. */
function overReplicates(planes: readonly Float64Array[], at: number): { mean: number; se: number } {
  let count = 0;
  let sum = 0;
  for (const plane of planes) {
    if (!Number.isFinite(plane[at])) continue;
    sum += plane[at];
    count++;
  }
  if (count === 0) return { mean: NaN, se: NaN };
  const mean = sum / count;
  let square = 0;
  for (const plane of planes) if (Number.isFinite(plane[at])) square += (plane[at] - mean) ** 2;
  return { mean, se: count > 1 ? Math.sqrt(square / (count - 1) / count) : NaN };
}

function planesOf(store: Store, study: Study, arm: number, name: string): Float64Array[] {
  return Array.from({ length: study.replicates }, (_, r) => decodePlane(keptBytes(store, r, arm, name)!));
}

function incidenceRows(store: Store, study: Study): Row[] {
  const rows: Row[] = [];
  study.arms.forEach((arm, a) => {
    const planes = planesOf(store, study, a, 'incidence');
    for (let generation = 0; generation < study.generations; generation++) {
      for (let p = 0; p < PERCENTILES; p++) {
        const at = generation * 2 * PERCENTILES + p;
        const growth = overReplicates(planes, at);
        const byRank = overReplicates(planes, at + PERCENTILES);
        rows.push({
          arm: arm.name,
          generation,
          percentile: p + 0.5,
          growth: growth.mean,
          growth_by_initial_rank: byRank.mean,
          mc_se: growth.se,
          mc_se_by_initial_rank: byRank.se,
        });
      }
    }
  });
  return rows;
}

/** Spans of one generation, and the whole horizon where that is longer. */
function transitionRows(store: Store, study: Study): Row[] {
  const rows: Row[] = [];
  const last = study.generations;
  const spans = Array.from({ length: last }, (_, t): [number, number] => [t, t + 1]);
  if (last > 1) spans.push([0, last]);
  study.arms.forEach((arm, a) => {
    const planes = planesOf(store, study, a, 'transitions');
    spans.forEach(([from, to], span) => {
      for (let f = 0; f < FIFTHS; f++) {
        const shares = planes.map((plane) => {
          const counts = plane.subarray((span * FIFTHS + f) * FIFTHS, (span * FIFTHS + f + 1) * FIFTHS);
          const total = counts.reduce((x, y) => x + y, 0);
          return counts.map((count) => count / total);
        });
        for (let g = 0; g < FIFTHS; g++) {
          rows.push({
            arm: arm.name,
            from_generation: from,
            to_generation: to,
            from_quintile: f + 1,
            to_quintile: g + 1,
            share: overReplicates(shares, g).mean,
          });
        }
      }
    });
  });
  return rows;
}

/** What each arm's network was asked for and reached, by replicate, as the runs noted it. */
function networkNotes(store: Store, study: Study): Record<string, unknown[]> {
  const decoder = new TextDecoder();
  return Object.fromEntries(
    study.arms.map((arm, a) => [
      arm.name,
      Array.from({ length: study.replicates }, (_, r) =>
        JSON.parse(decoder.decode(keptBytes(store, r, a, 'network.json')!)),
      ),
    ]),
  );
}
