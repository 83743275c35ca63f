/**
 * The data files a reader can keep of the study shown: panel, ties, the results folder, the study.
 *
 * Each is made when it is asked for, from a results folder or a run in the page alike. Pictures and figures are
 * the screen's.
 */

import { fileName } from '../data/download.js';
import { panelCsv } from '../data/panel-csv.js';
import type { Source } from '../data/source.js';

/** Something to keep. */
export interface DataOffer {
  readonly name: string;
  /** A line on what it is. */
  readonly says: string;
  /** What is said while it is made. */
  readonly doing: string;
  /** @throws Error with a sentence for the reader when the results do not hold it */
  make(): Promise<{ readonly name: string; readonly content: Uint8Array | Blob | string }>;
}

/** Replicates the study asks for, which a run in the page may not have reached yet. */
export function replicatesAsked(source: Source): number {
  return Number(/^replicates: (\d+)$/m.exec(source.info.yaml)?.[1] ?? source.info.replicates);
}

/** What to say of results that are not whole yet, or null. */
export function partialNote(source: Source): string | null {
  const asked = replicatesAsked(source);
  const there = source.info.replicates;
  if (there >= asked) return null;
  return `The run has not ended: what is saved now holds ${there === 1 ? 'the first replicate' : `${there} replicates`} of ${asked}.`;
}

/** The data files of a study. @param source - the results shown */
export function dataOffers(source: Source): DataOffer[] {
  const stem = fileName(source.info.title);
  return [
    {
      name: 'Panel (CSV)',
      says: 'every household in every generation, for any statistics program',
      doing: 'Writing the panel as CSV …',
      make: async () => {
        await kept(source, 'panel');
        return { name: `${stem}-panel.csv`, content: await panelCsv(source) };
      },
    },
    {
      name: 'Panel (Parquet)',
      says: 'the same, compact',
      doing: 'Saving the panel …',
      make: async () => {
        const names = await kept(source, 'panel');
        if (!names.includes('panel.parquet')) {
          throw new Error(
            'This study keeps its panel as CSV only: save that, or add parquet to keep.formats and run it.',
          );
        }
        return { name: `${stem}-panel.parquet`, content: await source.file('panel.parquet') };
      },
    },
    {
      name: 'Ties',
      says: 'who has ties to whom, and when',
      doing: 'Saving the ties …',
      make: async () => {
        const names = await kept(source, 'ties');
        const name = names.includes('ties.parquet') ? 'ties.parquet' : 'ties.csv';
        return { name: `${stem}-${name}`, content: await source.file(name) };
      },
    },
    {
      name: 'Results folder (ZIP)',
      says: 'all tables, codebook and manifest, as the command line writes them',
      doing: 'Packing the folder …',
      make: async () => {
        const { zipFiles } = await import('../../sim/results/bundle.js');
        const files = new Map<string, Uint8Array>();
        for (const name of await source.files()) files.set(name, await source.file(name));
        return { name: `${stem}.zip`, content: zipFiles(stem, files) };
      },
    },
    {
      name: 'Report (HTML)',
      says: 'the answer with figures and the model, to read, print or send',
      doing: 'Saving the report …',
      make: async () => {
        if (!(await source.files()).includes('report.html')) throw new Error('These results hold no report.');
        return { name: `${stem}-report.html`, content: await source.file('report.html') };
      },
    },
    {
      name: 'Study (YAML)',
      says: 'every setting written out: running it again gives the same bytes',
      doing: 'Saving the study …',
      make: async () => ({ name: `${stem}.yaml`, content: source.info.yaml }),
    },
  ];
}

/** Names of the results' files, when a table is among them. */
async function kept(source: Source, table: string): Promise<readonly string[]> {
  const names = await source.files();
  if (names.some((name) => name.startsWith(`${table}.`))) return names;
  throw new Error(
    table === 'panel' ? 'This study keeps no panel (keep.panel: none).' : `These results hold no ${table}.`,
  );
}
