/**
 * The regressions a study asks for: checked before it runs, run once its tables are there.
 *
 * Reads and writes through whoever calls, so that the command line and the browser make the same files.
 */
import { InputError, type Problem } from '../../network/errors.js';
import type { Results } from '../results/read.js';
import { factsOf } from '../results/run-replicate.js';
import { tableNamed, tablesOf } from '../results/tables.js';
import type { Study } from '../study/complete.js';
import type { Prepared } from '../study/replicate.js';
import { estimateFiles } from './output.js';
import { panelSource } from './panel.js';
import type { Placer } from './plan.js';
import { type PlanResults, runEstimates } from './run.js';

/**
 * Refuses estimates that name columns or arms the run will not have. Call before the run.
 *
 * @param place - gives `file:line:column` of a part of the study
 * @throws {InputError} with every problem
 */
export async function checkStudyEstimates(prepared: Prepared, place: Placer): Promise<void> {
  const { study } = prepared;
  if (study.estimates === undefined) return;
  const tables = tablesOf(factsOf(prepared));
  const kinds = new Map<string, 'number' | 'text'>();
  for (const name of ['households', 'panel'] as const) {
    for (const field of tableNamed(tables, name).fields)
      kinds.set(field.name, field.type === 'text' ? 'text' : 'number');
  }
  // without replicates nothing is read: only the names are checked
  await runEstimates(
    study.estimates,
    {
      place: study.study,
      kinds,
      arms: study.arms.map((arm) => arm.name),
      replicates: [],
      seed: study.seed,
      read: () => Promise.reject(new Error('no rows to read before the run')),
    },
    place,
  );
}

/** What a study's estimates came to. */
export interface StudyEstimates {
  /** Null when the study has no estimates, or none could be had. */
  readonly estimates: PlanResults | null;
  /** Files of the results folder, by name. */
  readonly files: Readonly<Record<string, string>>;
  /** Why estimates could not be had: said, but no reason to lose the run. */
  readonly problems: readonly Problem[];
}

/**
 * Runs the study's estimates on its results.
 *
 * @param source - where the results are, for errors
 */
export async function studyEstimates(
  study: Study,
  results: Results,
  source: string,
  place: Placer,
): Promise<StudyEstimates> {
  if (study.estimates === undefined) return { estimates: null, files: {}, problems: [] };
  try {
    const estimates = await runEstimates(study.estimates, await panelSource(results, source), place);
    const files = estimateFiles(study.estimates, estimates, { source: study.study, plan: 'study.yaml' });
    return { estimates, files, problems: [] };
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    return { estimates: null, files: {}, problems: error.problems };
  }
}
