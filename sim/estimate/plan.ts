/**
 * A plan file of regressions: from its text to estimates, every problem with its line and column.
 *
 * What an estimate may say is in ../study/estimates.ts, since a study may hold estimates too. Which columns there are,
 * and checks that need the data, are terms.ts and run.ts. Reads no files.
 */
import { isMap, isNode, isPair, isScalar, isSeq, LineCounter, parseDocument } from 'yaml';
import { z } from 'zod';
import { InputError, type Problem } from '../../network/errors.js';
import { checkEstimates, DRAW_KEYS, Estimate, Estimates, TERM_KEYS } from '../study/estimates.js';
import { type Path, pathText, problemsOf, type StudyProblem } from '../study/problems.js';

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

/** A plan file. */
export const PlanFile = z.strictObject({
  estimates: Estimates,
  seed: z
    .union([z.string().min(1), z.number()])
    .optional()
    .describe('Seed of survey draws; the study’s own unless given.'),
});

export type PlanFile = z.output<typeof PlanFile>;

/** Gives `file:line:column` of a value of the plan, or (`atKey`) of its key. */
export type Placer = (path: Path, atKey?: boolean) => string;

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
  const lines = new LineCounter();
  const document = parseDocument(text, { lineCounter: lines, prettyErrors: false, version: '1.2' });
  if (document.errors.length > 0) {
    throw new InputError(
      document.errors.slice(0, 20).map((error): Problem => {
        const { line, col } = lines.linePos(error.pos[0]);
        return {
          code: 'bad-yaml',
          place: `${file}:${line}:${col}`,
          problem: `this is not valid YAML (${error.message.split('\n')[0]})`,
          remedy: 'check the indentation, quotes and brackets here',
        };
      }),
    );
  }
  const place: Placer = (path, atKey = false) => {
    const { line, col } = lines.linePos(offsetOf(document.contents, path, atKey));
    return `${file}:${line}:${col}`;
  };
  let raw: unknown;
  try {
    raw = document.toJS({ maxAliasCount: 100 });
  } catch (error) {
    throw new InputError({
      code: 'bad-yaml',
      place: `${file}:1:1`,
      problem: `this YAML cannot be read (${(error as Error).message})`,
      remedy: 'write the plan without aliases',
    });
  }
  if (raw === null || typeof raw !== 'object' || Array.isArray(raw)) {
    throw new InputError({
      code: 'empty-plan',
      place: `${file}:1:1`,
      problem: raw === null || raw === undefined ? 'the plan is empty' : 'this is not a plan',
      remedy: 'start with estimates: and a list of regressions',
    });
  }
  const parsed = PlanFile.safeParse(raw);
  if (!parsed.success) {
    const found = parsed.error.issues.flatMap((issue) => problemsOf(issue, raw, keysAt)).map(inPlan);
    const offset = (p: StudyProblem): number => offsetOf(document.contents, p.path, p.atKey ?? false);
    throw placed(
      withoutEchoes(found).sort((a, b) => offset(a) - offset(b)),
      place,
    );
  }
  const problems = checkEstimates(parsed.data.estimates);
  if (problems.length > 0) throw placed(problems, place);
  return { ...parsed.data, place };
}

/** Problems with their places, as one error. */
export function placed(problems: readonly StudyProblem[], place: Placer): InputError {
  return new InputError(
    problems.map((found) => ({
      code: found.code,
      place: place(found.path, found.atKey),
      problem: found.problem,
      remedy: found.remedy,
    })),
  );
}

function inPlan(found: StudyProblem): StudyProblem {
  return { ...found, problem: found.problem.replace('the study', 'the plan') };
}

/** A mistyped key also leaves the right one missing: the second complaint would only distract. */
function withoutEchoes(problems: readonly StudyProblem[]): StudyProblem[] {
  const parent = (path: Path): string => pathText(path.slice(0, -1));
  const mistyped = new Set(problems.filter((p) => p.code === 'unknown-key').map((p) => parent(p.path)));
  return problems.filter((p) => p.code !== 'missing-key' || !mistyped.has(parent(p.path)));
}

/** Character offset of a value or key, or of the deepest part of the path that exists. */
function offsetOf(contents: unknown, path: Path, atKey: boolean): number {
  let node: unknown = contents;
  let offset = isNode(node) ? (node.range?.[0] ?? 0) : 0;
  for (let depth = 0; depth < path.length; depth++) {
    const step = path[depth];
    if (isMap(node)) {
      const pair = node.items.find(
        (item) => isPair(item) && isScalar(item.key) && String(item.key.value) === String(step),
      );
      if (pair === undefined) return offset;
      const key = pair.key as { range?: [number, number, number] | null };
      if ((depth === path.length - 1 && atKey) || !isNode(pair.value)) return key.range?.[0] ?? offset;
      node = pair.value;
    } else if (isSeq(node)) {
      const item = node.items[step as number];
      if (!isNode(item)) return offset;
      node = item;
    } else return offset;
    offset = (node as { range?: [number, number, number] | null }).range?.[0] ?? offset;
  }
  return offset;
}
