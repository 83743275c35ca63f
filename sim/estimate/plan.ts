/**
 * A plan file of regressions: from its text to estimates, every problem with its line and column.
 *
 * What an estimate may say is in ../study/estimates.ts, since a study may hold estimates too. Which columns there are,
 * and checks that need the data, are terms.ts and run.ts. Reads no files.
 */
import { z } from 'zod';
import { checkEstimates, DRAW_KEYS, Estimate, Estimates, TERM_KEYS } from '../study/estimates.js';
import { type Path, problemsOf, type StudyProblem } from '../study/problems.js';
import { type Placer, readYaml } from '../study/yaml-file.js';

export {
  checkEstimates,
  Estimate,
  Estimates,
  errorsOf,
  type Filter,
  type Grouping,
  groupingsOf,
  type Term,
} from '../study/estimates.js';
export { type Placer, placed } from '../study/yaml-file.js';

/** A plan file. */
export const PlanFile = z.strictObject({
  estimates: Estimates,
  seed: z
    .union([z.string().min(1), z.number()])
    .optional()
    .describe('Seed of survey draws; the study’s own unless given.'),
});

export type PlanFile = z.output<typeof PlanFile>;

export interface Plan extends PlanFile {
  readonly place: Placer;
}

const PLAN_KEYS = Object.keys(PlanFile.shape);
const ESTIMATE_KEYS = Object.keys(Estimate.shape);

/** The keys that may stand at a path of a plan, for the nearest right key. */
function keysAt(path: Path): readonly string[] {
  const [, , field, ...rest] = path;
  if (path.length === 0) return PLAN_KEYS;
  if (path.length === 2) return ESTIMATE_KEYS;
  if (field === 'draw') return DRAW_KEYS;
  if (field === 'where') return ['from', 'to', 'in'];
  if (field === 'effects' || field === 'cluster') return ['product'];
  return rest.length > 0 || field === 'outcome' ? [...TERM_KEYS, 'base'] : [];
}

/**
 * Parses a plan file.
 *
 * @param text - YAML 1.2 (JSON is YAML)
 * @param file - the name shown in errors
 * @throws {InputError} with every problem found, in file order, each with line and column
 */
export function parsePlan(text: string, file: string): Plan {
  const yaml = readYaml(text, file, { noun: 'plan', remedy: 'start with estimates: and a list of regressions' });
  const parsed = PlanFile.safeParse(yaml.raw);
  if (!parsed.success) {
    throw yaml.refusal(parsed.error.issues.flatMap((issue) => problemsOf(issue, yaml.raw, keysAt)).map(inPlan));
  }
  const problems = checkEstimates(parsed.data.estimates);
  if (problems.length > 0) throw yaml.refusal(problems);
  return { ...parsed.data, place: yaml.place };
}

function inPlan(found: StudyProblem): StudyProblem {
  return { ...found, problem: found.problem.replace('the study', 'the plan') };
}
