/**
 * From the text of a study file to a complete study, every problem with its line and column.
 *
 * All problems are gathered before anything is refused. Reads no file: inputs.ts loads what a study names.
 */
import { isMap, isNode, isPair, isScalar, isSeq, LineCounter, parseDocument, stringify } from 'yaml';
import type { z } from 'zod';
import { InputError, type Problem } from '../../network/errors.js';
import { checkStudy } from './check.js';
import { completeStudy, type Study } from './complete.js';
import { type Path, pathText, problemsOf, type StudyProblem, valueAt } from './problems.js';
import { NOT_YET, StudyFile } from './schema.js';

/** A study that may run, and where its parts stand in the file. */
export interface ParsedStudy {
  readonly study: Study;
  /** `file:line:column` of a value (or, `atKey`, of its key); of the nearest part that exists. */
  place(path: Path, atKey?: boolean): string;
}

/**
 * Parses, checks and completes a study.
 *
 * @param text - YAML 1.2 (JSON is YAML)
 * @param file - the name shown in errors
 * @throws {InputError} with every problem found, in file order
 */
export function parseStudy(text: string, file: string): ParsedStudy {
  const lines = new LineCounter();
  const document = parseDocument(text, { lineCounter: lines, prettyErrors: false, version: '1.2' });
  if (document.errors.length > 0) {
    throw new InputError(
      document.errors.slice(0, 20).map((error): Problem => {
        const { line, col } = lines.linePos(error.pos[0]);
        const duplicate = error.code === 'DUPLICATE_KEY';
        return {
          code: duplicate ? 'duplicate-key' : 'bad-yaml',
          place: `${file}:${line}:${col}`,
          problem: duplicate ? 'this key stands twice' : `this is not valid YAML (${error.message.split('\n')[0]})`,
          remedy: duplicate ? 'keep one of the two' : 'check the indentation, quotes and brackets here',
        };
      }),
    );
  }
  const place = (path: Path, atKey = false): string => {
    const { line, col } = lines.linePos(offsetOf(document.contents, path, atKey));
    return `${file}:${line}:${col}`;
  };
  const raise = (problems: readonly StudyProblem[]): never => {
    const placed = problems.map((found) => ({
      offset: offsetOf(document.contents, found.path, found.atKey ?? false),
      problem: {
        code: found.code,
        place: place(found.path, found.atKey),
        problem: found.problem,
        remedy: found.remedy,
      } satisfies Problem,
    }));
    placed.sort((a, b) => a.offset - b.offset);
    throw new InputError(placed.map((found) => found.problem));
  };

  let raw: unknown;
  try {
    raw = document.toJS({ maxAliasCount: 100 });
  } catch (error) {
    throw new InputError({
      code: 'bad-yaml',
      place: `${file}:1:1`,
      problem: `this YAML cannot be read (${(error as Error).message})`,
      remedy: 'write the study without aliases',
    });
  }
  if (raw === null || typeof raw !== 'object' || Array.isArray(raw)) {
    throw new InputError({
      code: 'empty-study',
      place: `${file}:1:1`,
      problem: raw === null || raw === undefined ? 'the study file is empty' : 'this is not a study',
      remedy: "write a built-in study out with 'rungsight presets NAME' and edit it",
    });
  }
  const { rest, refused } = withoutLater(raw as Record<string, unknown>);
  const parsed = StudyFile.safeParse(rest);
  if (!parsed.success) {
    const problems = parsed.error.issues.flatMap((issue) => problemsOf(issue, rest, (path) => keysAt(path, rest)));
    return raise([...refused, ...withoutEchoes(problems)]);
  }
  const problems = [...refused, ...checkStudy(parsed.data)];
  if (problems.length > 0) return raise(problems);
  return { study: completeStudy(parsed.data), place };
}

/** The YAML of a complete study, as a results folder keeps it. */
export function studyText(study: Study): string {
  return stringify(study, { lineWidth: 0, aliasDuplicateObjects: false });
}

/** A mistyped key also leaves the right one missing: the second complaint would only distract. */
function withoutEchoes(problems: readonly StudyProblem[]): StudyProblem[] {
  const meant = new Set(problems.filter((found) => found.meant !== undefined).map((found) => pathText(found.meant!)));
  return problems.filter((found) => found.code !== 'missing-key' || !meant.has(pathText(found.path)));
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

/** Character offset of a value or key, or of the deepest part of the path that exists. */
function offsetOf(contents: unknown, path: Path, atKey: boolean): number {
  let node: unknown = contents;
  let offset = isNode(node) ? (node.range?.[0] ?? 0) : 0;
  for (let depth = 0; depth < path.length; depth++) {
    const step = path[depth]!;
    if (isMap(node)) {
      const pair = node.items.find(
        (item) => isPair(item) && isScalar(item.key) && String(item.key.value) === String(step),
      );
      if (pair === undefined) return offset;
      const key = pair.key as { range?: [number, number, number] | null };
      const value = pair.value;
      const last = depth === path.length - 1;
      if ((last && atKey) || !isNode(value) || (isScalar(value) && value.value === null)) {
        return key.range?.[0] ?? offset;
      }
      node = value;
    } else if (isSeq(node)) {
      const item = node.items[step as number];
      if (!isNode(item)) return offset;
      node = item;
    } else {
      return offset;
    }
    offset = (node as { range?: [number, number, number] | null }).range?.[0] ?? offset;
  }
  return offset;
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
