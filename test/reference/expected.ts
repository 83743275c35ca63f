/**
 * Reads the sets of outside values in this folder and compares with them at the tolerance each value carries.
 *
 * A set is a folder with `expected.json` ({checks: {id: {value, rtol, atol, …}}}) and its data. Where the values
 * come from is told in SOURCES.md.
 */
import { readFileSync } from 'node:fs';
import { expect } from 'vitest';

/** A value of a set: number, array, matrix, or named numbers; null where undefined. */
export type Expected = number | null | readonly Expected[] | { readonly [name: string]: Expected };

export interface Check {
  readonly value: Expected;
  readonly what: string;
  readonly rtol: number;
  readonly atol: number;
  readonly [extra: string]: unknown;
}

export function checksOf(set: string): Record<string, Check> {
  const text = readFileSync(new URL(`${set}/expected.json`, import.meta.url), 'utf8');
  return (JSON.parse(text) as { checks: Record<string, Check> }).checks;
}

/** Rows of a plain CSV of a set (no quoted fields), as columns of text. */
export function columnsOf(set: string, file: string): Record<string, string[]> {
  const text = readFileSync(new URL(`${set}/${file}`, import.meta.url), 'utf8').trim();
  const [header, ...rows] = text.split(/\r?\n/).map((line) => line.split(','));
  return Object.fromEntries(header.map((name, c) => [name, rows.map((row) => row[c])]));
}

/** Fails unless |actual − value| ≤ atol + rtol |value|, element by element. */
export function expectMatch(actual: unknown, check: Check | undefined, id: string): void {
  if (check === undefined) throw new Error(`no check named ${id}`);
  compare(actual, check.value, check, id);
}

function compare(actual: unknown, value: Expected, check: Check, id: string): void {
  if (typeof value === 'number') {
    const difference = Math.abs((actual as number) - value);
    const allowed = check.atol + check.rtol * Math.abs(value);
    expect(difference, `${id}: got ${actual as number}, expected ${value}, allowed ${allowed}`).toBeLessThanOrEqual(
      allowed,
    );
  } else if (value === null) {
    throw new Error(`${id} is undefined in its source: test it by hand`);
  } else if (Array.isArray(value)) {
    const list = Array.from(actual as ArrayLike<unknown>);
    expect(list.length, `${id}: length`).toBe(value.length);
    for (let k = 0; k < value.length; k++) compare(list[k], value[k] as Expected, check, `${id}[${k}]`);
  } else {
    for (const [name, v] of Object.entries(value)) {
      compare((actual as Record<string, unknown>)[name], v as Expected, check, `${id}.${name}`);
    }
  }
}
