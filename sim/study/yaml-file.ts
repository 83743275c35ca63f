/**
 * A YAML file with the place of everything in it: what is wrong is told with line and column.
 *
 * Serves study files and plan files. Knows nothing of what they mean.
 */
import { isMap, isNode, isPair, isScalar, isSeq, LineCounter, parseDocument } from 'yaml';
import { InputError, type Problem } from '../../network/errors.js';
import { type Path, pathText, type StudyProblem } from './problems.js';

/** Gives `file:line:column` of a value, or (`atKey`) of its key; of the nearest part that exists. */
export type Placer = (path: Path, atKey?: boolean) => string;

export interface YamlFile {
  /** The file's keys. */
  readonly raw: Record<string, unknown>;
  readonly place: Placer;
  /** One error of all problems, in file order. */
  refusal(problems: readonly StudyProblem[]): InputError;
}

/** What a kind of file is called in messages. */
interface Kind {
  /** `study`, `plan`. */
  readonly noun: string;
  /** What to do about an empty file. */
  readonly remedy: string;
}

/**
 * Reads YAML 1.2 (JSON is YAML).
 *
 * @param file - the name shown in errors
 * @throws {InputError} `bad-yaml`, `duplicate-key`, `empty-…`
 */
export function readYaml(text: string, file: string, kind: Kind): YamlFile {
  const lines = new LineCounter();
  const document = parseDocument(text, { lineCounter: lines, prettyErrors: false, version: '1.2' });
  const placeAt = (offset: number): string => {
    const { line, col } = lines.linePos(offset);
    return `${file}:${line}:${col}`;
  };
  if (document.errors.length > 0) {
    throw new InputError(
      document.errors.slice(0, 20).map((error): Problem => {
        const duplicate = error.code === 'DUPLICATE_KEY';
        return {
          code: duplicate ? 'duplicate-key' : 'bad-yaml',
          place: placeAt(error.pos[0]),
          problem:
            error.code === 'MULTIPLE_DOCS'
              ? 'a second document begins here'
              : duplicate
                ? 'this key stands twice'
                : `this is not valid YAML (${error.message.split('\n')[0]})`,
          remedy:
            error.code === 'MULTIPLE_DOCS'
              ? 'keep one of the two (remove the line ---)'
              : duplicate
                ? 'keep one of the two'
                : 'check the indentation, quotes and brackets here',
        };
      }),
    );
  }
  let raw: unknown;
  try {
    raw = document.toJS({ maxAliasCount: 100 });
  } catch (error) {
    throw new InputError({
      code: 'bad-yaml',
      place: `${file}:1:1`,
      problem: `this YAML cannot be read (${(error as Error).message})`,
      remedy: `write the ${kind.noun} without aliases`,
    });
  }
  if (raw === null || typeof raw !== 'object' || Array.isArray(raw)) {
    throw new InputError({
      code: `empty-${kind.noun}`,
      place: `${file}:1:1`,
      problem: raw === null || raw === undefined ? `the ${kind.noun} file is empty` : `this is not a ${kind.noun}`,
      remedy: kind.remedy,
    });
  }
  const offset = (path: Path, atKey = false): number => offsetOf(document.contents, path, atKey);
  const place: Placer = (path, atKey) => placeAt(offset(path, atKey));
  return {
    raw: raw as Record<string, unknown>,
    place,
    refusal: (problems) =>
      placed(
        withoutEchoes(problems).sort((a, b) => offset(a.path, a.atKey) - offset(b.path, b.atKey)),
        place,
      ),
  };
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

/** A mistyped key also leaves the right one missing: the second complaint would only distract. */
function withoutEchoes(problems: readonly StudyProblem[]): StudyProblem[] {
  const meant = new Set(problems.filter((found) => found.meant !== undefined).map((found) => pathText(found.meant!)));
  return problems.filter((found) => found.code !== 'missing-key' || !meant.has(pathText(found.path)));
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
