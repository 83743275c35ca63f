/**
 * What a run adds once its tables are there: the regressions the study asks for, and the report.
 *
 * Both are written while the folder is still unfinished, so that a folder that is whole has them.
 */
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import type { Problem } from '../../network/errors.js';
import { studyEstimates } from '../estimate/of-study.js';
import type { Placer } from '../estimate/plan.js';
import type { PlanResults } from '../estimate/run.js';
import type { Codebook } from '../results/codebook.js';
import type { RunFolder } from '../results/folder.js';
import { folderSource } from '../results/open.js';
import { Results } from '../results/read.js';
import { reportHtml } from '../results/report/report.js';
import type { Study } from '../study/complete.js';
import { REPORT } from './report.js';

export { checkStudyEstimates } from '../estimate/of-study.js';

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
  const { estimates, files, problems } = await studyEstimates(study, results, folder.out, place);
  for (const [name, text] of Object.entries(files)) folder.writeFile(name, text);
  folder.writeFile(REPORT, await reportHtml(results, notes));
  return { estimates, problems };
}
