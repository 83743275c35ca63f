/**
 * From the text of a study file to a complete study, every problem with its line and column.
 *
 * All problems are gathered before anything is refused. Reads no file: inputs.ts loads what a study names.
 */
import { stringify } from 'yaml';
import type { z } from 'zod';
import { checkStudy } from './check.js';
import { completeStudy, type Study } from './complete.js';
import { type Path, problemsOf, type StudyProblem, valueAt } from './problems.js';
import { NOT_YET, StudyFile } from './schema.js';
import { type Placer, readYaml } from './yaml-file.js';

/** A study that may run, and where its parts stand in the file. */
export interface ParsedStudy {
  readonly study: Study;
  /** `file:line:column` of a value (or, `atKey`, of its key); of the nearest part that exists. */
  readonly place: Placer;
}

/**
 * Parses, checks and completes a study.
 *
 * @param text - YAML 1.2 (JSON is YAML)
 * @param file - the name shown in errors
 * @throws {InputError} with every problem found, in file order
 */
export function parseStudy(text: string, file: string): ParsedStudy {
  const yaml = readYaml(text, file, {
    noun: 'study',
    remedy: "write a built-in study out with 'rungsight presets NAME' and edit it",
  });
  const { rest, refused } = withoutLater(yaml.raw);
  const parsed = StudyFile.safeParse(rest);
  if (!parsed.success) {
    const problems = parsed.error.issues.flatMap((issue) => problemsOf(issue, rest, (path) => keysAt(path, rest)));
    throw yaml.refusal([...refused, ...problems]);
  }
  const problems = [...refused, ...checkStudy(parsed.data)];
  if (problems.length > 0) throw yaml.refusal(problems);
  return { study: completeStudy(parsed.data), place: yaml.place };
}

/** The YAML of a complete study, as a results folder keeps it. */
export function studyText(study: Study): string {
  return stringify(study, { lineWidth: 0, aliasDuplicateObjects: false });
}

/** Takes out what this version does not simulate yet; what would do nothing is let pass. */
function withoutLater(raw: Record<string, unknown>): { rest: Record<string, unknown>; refused: StudyProblem[] } {
  const refused: StudyProblem[] = [];
  const strip = (object: Record<string, unknown>, path: Path): Record<string, unknown> => {
    const kept = { ...object };
    for (const [key, sentence] of Object.entries(NOT_YET)) {
      if (!(key in kept)) continue;
      const value = kept[key];
      const idle =
        value === null ||
        (Array.isArray(value) && value.length === 0) ||
        (key === 'ties' && JSON.stringify(value) === '{"rule":"fixed"}');
      if (!idle) {
        refused.push({
          code: 'not-yet',
          path: [...path, key],
          atKey: true,
          problem: sentence,
          remedy: `remove '${key}'`,
        });
      }
      delete kept[key];
    }
    return kept;
  };
  const rest = strip(raw, []);
  if (Array.isArray(rest.arms)) {
    rest.arms = rest.arms.map((arm: unknown, a) =>
      arm !== null && typeof arm === 'object' && !Array.isArray(arm)
        ? strip(arm as Record<string, unknown>, ['arms', a])
        : arm,
    );
  }
  return { rest, refused };
}

// zod keeps a schema's structure in `_zod.def`; this reads the few kinds schema.ts uses
interface Definition {
  readonly type: string;
  readonly innerType?: z.ZodType;
  readonly element?: z.ZodType;
  readonly options?: readonly z.ZodType[];
  readonly shape?: Readonly<Record<string, z.ZodType>>;
  readonly values?: readonly unknown[];
}

function definition(schema: z.ZodType): Definition {
  return schema._zod.def as unknown as Definition;
}

/** Object schemas that stand at a path, unwrapping optional, default and unions (by `kind` where it decides). */
function objectsAt(schema: z.ZodType, path: Path, raw: unknown): Definition[] {
  const def = definition(schema);
  if (def.innerType !== undefined) return objectsAt(def.innerType, path, raw);
  if (def.options !== undefined) {
    const options = def.options.filter((option) => matchesKind(option, raw));
    return (options.length > 0 ? options : def.options).flatMap((option) => objectsAt(option, path, raw));
  }
  if (def.type === 'array' && path.length > 0) {
    return objectsAt(def.element!, path.slice(1), valueAt(raw, [path[0]!]));
  }
  if (def.type !== 'object') return [];
  if (path.length === 0) return [def];
  const inner = def.shape?.[String(path[0])];
  return inner === undefined ? [] : objectsAt(inner, path.slice(1), valueAt(raw, [path[0]!]));
}

function matchesKind(option: z.ZodType, raw: unknown): boolean {
  const def = definition(option);
  if (def.options !== undefined) return def.options.some((inner) => matchesKind(inner, raw));
  const kind = def.shape?.kind;
  if (kind === undefined) return valueAt(raw, ['kind']) === undefined;
  return definition(kind).values?.includes(valueAt(raw, ['kind'])) ?? false;
}

function keysAt(path: Path, raw: unknown): readonly string[] {
  return [...new Set(objectsAt(StudyFile, path, raw).flatMap((def) => Object.keys(def.shape ?? {})))];
}
