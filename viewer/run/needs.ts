/**
 * What a study run in the page will need, before it runs: household-generations to simulate, and memory.
 *
 * An estimate from counts alone, checked against real runs in the tests; it builds nothing.
 */
import type { Study } from '../../sim/study/complete.js';

export interface Needs {
  /** Households × generations × arms × replicates. */
  readonly householdGenerations: number;
  /** Rows of the panel that are kept. */
  readonly rows: number;
  /** Bytes while it runs, results included. */
  readonly bytes: number;
  /** Bytes of these for one replicate at work. */
  readonly work: number;
}

/** What a page can hold: browsers give one page about 4 GB. */
export const MOST_BYTES = 3.5e9;

/** Bytes of a panel row in Parquet: measured 150 to 190 for a panel with one milestone; numbers hardly compress. */
const ROW_PARQUET = 190;
/** Bytes of a panel row in CSV: about 17 characters a number. */
const ROW_CSV = 380;
/** Bytes of a tie row: two integers, a weight, two generations, after compression; kept as parts and in the final file. */
const TIE_ROW = 14;
/** Columns of a replicate at work, each 8 bytes: engine, parents, measures, the row group being filled. */
const WORKING_COLUMNS = 90;
/** The page, the engine's code and the drawing. */
const BASE = 60e6;

/** Mean ties of a household in each arm, as the study asks for them. */
function meanDegree(study: Study, a: number, seen = 0): number {
  const { network } = study.arms[a]!;
  if ('from' in network) {
    const source = study.arms.findIndex(({ name }) => name === network.from);
    return source < 0 || seen > study.arms.length ? 10 : meanDegree(study, source, seen + 1);
  }
  if ('mean_degree' in network) return network.mean_degree;
  if (network.kind === 'ring') return network.degree;
  if (network.kind === 'preferential') return 2 * network.ties;
  if (network.kind === 'configuration' && network.degrees.kind !== 'file') return network.degrees.mean;
  return 10;
}

/**
 * What a study needs in the page.
 *
 * @param households - n, from the study or from its households file
 */
export function needs(study: Study, households: number): Needs {
  const { generations, replicates, keep } = study;
  const arms = study.arms.length;
  const part = typeof keep.panel === 'object' ? keep.panel : null;
  const kept = keep.panel === 'none' ? 0 : Math.min(replicates, part?.replicates ?? replicates);
  const shown = Math.ceil(generations / (part?.every ?? 1));
  const each = Math.min(households, part?.households ?? households);
  const rows = kept * arms * shown * each;
  const row = (keep.formats.includes('parquet') ? ROW_PARQUET : 0) + (keep.formats.includes('csv') ? ROW_CSV : 0);
  const ties = study.arms.reduce((sum, _, a) => sum + (meanDegree(study, a) * households) / 2, 0);
  // parts and the tables made of them are in memory together for a moment
  const results = 2 * (rows * row + replicates * (ties * TIE_ROW + arms * households * 40));
  const work = households * 8 * WORKING_COLUMNS + ties * 2 * 24;
  return {
    householdGenerations: households * generations * arms * replicates,
    rows,
    bytes: BASE + results + work,
    work,
  };
}

/** Memory in words: `needs about 210 MB`. */
export function memoryWords({ bytes }: Needs): string {
  const mb = bytes / 1e6;
  const said = mb >= 950 ? `${(mb / 1000).toFixed(1)} GB` : `${Math.max(10, Math.round(mb / 10) * 10)} MB`;
  return `needs about ${said} of memory`;
}
