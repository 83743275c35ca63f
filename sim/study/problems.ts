/**
 * Turns what the schema refuses into sentences a user can act on: the right key, the allowed values, the range.
 *
 * Pure: no positions (parse.ts adds line and column), no files.
 */
import type { z } from 'zod';
import { nearest } from '../../network/errors.js';

/** Where in the study: keys and list positions from the top. */
export type Path = readonly (string | number)[];

/** A problem of a study before its line and column are known. */
export interface StudyProblem {
  readonly code: string;
  readonly path: Path;
  /** True when the problem lies with the key at `path`, not with its value. */
  readonly atKey?: boolean;
  /** The key that a mistyped one probably stands for. */
  readonly meant?: Path;
  readonly problem: string;
  readonly remedy: string;
}

type Issue = z.core.$ZodIssue;

/** A path as a reader writes it: `arms[1].network.kind`. */
export function pathText(path: Path): string {
  let out = '';
  for (const step of path) {
    out += typeof step === 'number' ? `[${step}]` : out === '' ? step : `.${step}`;
  }
  return out === '' ? 'the study' : out;
}

/** The value at a path of parsed YAML, or undefined. */
export function valueAt(raw: unknown, path: Path): unknown {
  let at: unknown = raw;
  for (const step of path) {
    if (at === null || typeof at !== 'object') return undefined;
    at = (at as Record<string | number, unknown>)[step];
  }
  return at;
}

/** How a value is shown in an error: short, with its kind. */
export function shown(value: unknown): string {
  if (value === undefined) return 'nothing';
  if (value === null) return 'nothing (an empty value)';
  if (typeof value === 'string') return `text '${value.length > 40 ? `${value.slice(0, 40)}…` : value}'`;
  if (typeof value === 'number' || typeof value === 'boolean') return String(value);
  if (Array.isArray(value)) return `a list of ${value.length}`;
  return 'a group of keys';
}

const KIND: Readonly<Record<string, string>> = {
  number: 'a number',
  int: 'a whole number',
  string: 'text',
  boolean: 'true or false',
  array: 'a list',
  object: 'a group of keys',
};

/** Every problem behind one schema issue. `keysAt` names the keys the schema allows at a path. */
export function problemsOf(issue: Issue, raw: unknown, keysAt: (path: Path) => readonly string[]): StudyProblem[] {
  const path = issue.path as Path;
  const where = pathText(path);
  const value = valueAt(raw, path);
  switch (issue.code) {
    case 'unrecognized_keys':
      return issue.keys.map((key) => {
        const keys = keysAt(path);
        if (keys.includes(key)) {
          const beside = Object.keys((valueAt(raw, path) ?? {}) as object).filter((other) => other !== key);
          return {
            code: 'keys-exclude',
            path: [...path, key],
            atKey: true,
            problem: `'${key}' does not go with ${beside.map((other) => `'${other}'`).join(', ')} in ${where}`,
            remedy: 'keep one or the other',
          };
        }
        const guess = nearest(key, keys);
        return {
          code: 'unknown-key',
          path: [...path, key],
          atKey: true,
          ...(guess === undefined ? {} : { meant: [...path, guess] }),
          problem: `unknown key '${key}' in ${where}`,
          remedy: guess === undefined ? `use one of ${keys.join(', ')}` : `did you mean '${guess}'?`,
        };
      });
    case 'invalid_type': {
      const expected = KIND[issue.expected] ?? issue.expected;
      if (value === undefined) {
        return [{ code: 'missing-key', path, problem: `${where} is missing`, remedy: `add it (${expected})` }];
      }
      return [{ code: 'wrong-type', path, problem: `${where} is ${shown(value)}`, remedy: `give ${expected}` }];
    }
    case 'invalid_value': {
      const values = issue.values.map(String);
      if (value === undefined) {
        return [
          { code: 'missing-key', path, problem: `${where} is missing`, remedy: `use one of ${values.join(', ')}` },
        ];
      }
      return [unknownValue(path, value, values)];
    }
    case 'too_small':
    case 'too_big': {
      const low = issue.code === 'too_small';
      const bound = low ? issue.minimum : issue.maximum;
      if (issue.origin === 'string' || issue.origin === 'array') {
        const unit = issue.origin === 'string' ? 'characters' : 'entries';
        const have = (value as { length: number } | undefined)?.length ?? 0;
        return [
          {
            code: 'out-of-range',
            path,
            problem: have === 0 ? `${where} is empty` : `${where} has ${have} ${unit}`,
            remedy: `give ${low ? 'at least' : 'at most'} ${bound}`,
          },
        ];
      }
      const side = low ? (issue.inclusive ? 'at least' : 'above') : issue.inclusive ? 'at most' : 'below';
      return [
        {
          code: 'out-of-range',
          path,
          problem: `${where} is ${shown(value)}`,
          remedy: `give a number ${side} ${bound}`,
        },
      ];
    }
    case 'invalid_union':
      return problemsOfUnion(issue, path, raw, keysAt);
    default:
      return [
        { code: 'invalid', path, problem: `${where} is ${shown(value)}: ${issue.message}`, remedy: 'correct it' },
      ];
  }
}

function unknownValue(path: Path, value: unknown, values: readonly string[]): StudyProblem {
  const guess = nearest(String(value), values);
  const list = values.join(', ');
  return {
    code: 'unknown-value',
    path,
    problem: `${pathText(path)} is ${shown(value)}`,
    remedy: guess === undefined ? `use one of ${list}` : `did you mean '${guess}'? (one of ${list})`,
  };
}

/** Picks the alternative the user most likely meant: the one with the fewest complaints about its own keys. */
function problemsOfUnion(
  issue: Extract<Issue, { code: 'invalid_union' }>,
  path: Path,
  raw: unknown,
  keysAt: (path: Path) => readonly string[],
): StudyProblem[] {
  if ('discriminator' in issue && issue.discriminator !== undefined) {
    const options = ((issue as { options?: readonly unknown[] }).options ?? []).map(String);
    const value = valueAt(raw, path);
    if (value !== undefined && value !== null) return [unknownValue(path, value, options)];
    const parent = path.slice(0, -1);
    const parentValue = valueAt(raw, parent);
    if (parentValue === null || typeof parentValue !== 'object' || Array.isArray(parentValue)) {
      return [
        {
          code: 'wrong-type',
          path: parent,
          problem: `${pathText(parent)} is ${shown(parentValue)}`,
          remedy: 'give a group of keys',
        },
      ];
    }
    return [
      {
        code: 'missing-key',
        path,
        problem: `${pathText(path)} is missing`,
        remedy: `use one of ${options.join(', ')}`,
      },
    ];
  }
  const value = valueAt(raw, path);
  const isGroup = value !== null && typeof value === 'object' && !Array.isArray(value);
  let best: Issue[] | undefined;
  let bestScore = Infinity;
  for (const option of issue.errors) {
    let score = meantKey(option as Issue[], value) ? -8 : 0;
    for (const inner of option) {
      const own = inner.path.length === 0;
      if (own && inner.code === 'unrecognized_keys') score += 10 * inner.keys.length;
      else if (own) score += isGroup ? 1000 : 5;
      else if (inner.code === 'invalid_type' && valueAt(value, inner.path as Path) === undefined) score += 12;
      else if (
        inner.code === 'invalid_union' &&
        'discriminator' in inner &&
        valueAt(value, inner.path as Path) === undefined
      )
        score += 15;
      else score += 1;
    }
    if (score < bestScore) {
      best = option as Issue[];
      bestScore = score;
    }
  }
  const scalarKinds = issue.errors.flatMap((option) => option.filter((inner) => inner.path.length === 0));
  if (!isGroup && scalarKinds.length >= issue.errors.length) {
    const parts = [...new Set(scalarKinds.map(kindOf))];
    return [
      {
        code: value === undefined ? 'missing-key' : 'wrong-type',
        path,
        problem: `${pathText(path)} is ${value === undefined ? 'missing' : shown(value)}`,
        remedy: `give ${parts.join(' or ')}`,
      },
    ];
  }
  return (best ?? []).flatMap((inner) =>
    problemsOf({ ...inner, path: [...path, ...(inner.path as Path)] } as Issue, raw, keysAt),
  );
}

/** True when a key that is not known here is close to one that this alternative misses. */
function meantKey(option: readonly Issue[], value: unknown): boolean {
  const unknown = option.flatMap((inner) =>
    inner.code === 'unrecognized_keys' && inner.path.length === 0 ? inner.keys : [],
  );
  const missing = option
    .filter((inner) => inner.path.length === 1 && valueAt(value, inner.path as Path) === undefined)
    .map((inner) => String(inner.path[0]));
  return unknown.some((key) => nearest(key, missing) !== undefined);
}

function kindOf(issue: Issue): string {
  if (issue.code === 'invalid_type') return KIND[issue.expected] ?? issue.expected;
  if (issue.code === 'invalid_value') return `one of ${issue.values.map(String).join(', ')}`;
  if (issue.code === 'too_small') return `a number ${issue.inclusive ? 'at least' : 'above'} ${issue.minimum}`;
  if (issue.code === 'too_big') return `a number ${issue.inclusive ? 'at most' : 'below'} ${issue.maximum}`;
  return 'a group of keys';
}
