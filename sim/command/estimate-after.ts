/**
 * What a run adds once its tables are there: the regressions the study asks for, and the report.
 *
 * Both are written while the folder is still unfinished, so that a folder that is whole has them. A study's estimates
 * are checked against the columns the run will have before anything is simulated.
 */
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { InputError, type Problem } from '../../network/errors.js';
import { estimateFiles } from '../estimate/output.js';
import { panelSource } from '../estimate/panel.js';
import type { Placer } from '../estimate/plan.js';
import { type PlanResults, runEstimates } from '../estimate/run.js';
import type { Codebook } from '../results/codebook.js';
import type { RunFolder } from '../results/folder.js';
import { folderSource } from '../results/open.js';
import { Results } from '../results/read.js';
import { reportHtml } from '../results/report/report.js';
import { factsOf } from '../results/run-replicate.js';
import { tableNamed, tablesOf } from '../results/tables.js';
import type { Study } from '../study/complete.js';
import type { Prepared } from '../study/replicate.js';
import { REPORT } from './report.js';

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

/** What was added to the folder. */
export interface Added {
  /** Null when the study has no estimates, or none could be had. */
  readonly estimates: PlanResults | null;
  /** Why estimates could not be had: said, but no reason to lose the run. */
  readonly problems: readonly Problem[];
}

/**
 * Runs the study's estimates and writes their files and the report into an unfinished folder. Call after the codebook
 * and before `finish`.
 *
 * @param notes - the run's notes, which the manifest does not hold yet
 */
export async function addEstimatesAndReport(
  folder: RunFolder,
  study: Study,
  place: Placer,
  notes: Readonly<Record<string, unknown>>,
): Promise<Added> {
  const dir = folder.finished ? folder.out : folder.partial;
  const codebook = JSON.parse(readFileSync(join(dir, 'codebook.json'), 'utf8')) as Codebook;
  const results = new Results(folderSource(dir), folder.manifest, codebook);
  let estimates: PlanResults | null = null;
  let problems: readonly Problem[] = [];
  if (study.estimates !== undefined) {
    try {
      estimates = await runEstimates(study.estimates, await panelSource(results, folder.out), place);
      const files = estimateFiles(study.estimates, estimates, { source: study.study, plan: 'study.yaml' });
      for (const [name, text] of Object.entries(files)) folder.writeFile(name, text);
    } catch (error) {
      if (!(error instanceof InputError)) throw error;
      problems = error.problems;
    }
  }
  folder.writeFile(REPORT, await reportHtml(results, notes));
  return { estimates, problems };
}
