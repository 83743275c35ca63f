/** Reads the network sets of this folder as ties, and compares values that may be undefined (null there, NaN here). */
import { readFileSync } from 'node:fs';
import { expect } from 'vitest';
import { readEdgeList } from '../../network/exchange/edge-list.js';
import type { Ties } from '../../network/graph.js';
import { type Check, columnsOf, type Expected, expectMatch } from './expected.js';

/** Ties of a set and the columns of its households file, in that file's order. */
export function netOf(set: string, households: string): { ties: Ties; columns: Record<string, string[]> } {
  const columns = columnsOf(set, households);
  const text = readFileSync(new URL(`${set}/edges.csv`, import.meta.url), 'utf8');
  return { ties: readEdgeList(text, `${set}/edges.csv`, columns['id']).ties, columns };
}

/** Labels as numbers in the set's order: numeric where all are, else by code unit. */
export function codes(labels: readonly string[]): { group: Uint32Array; levels: string[] } {
  const levels = [...new Set(labels)];
  const numeric = levels.every((l) => l !== '' && Number.isFinite(Number(l)));
  levels.sort(numeric ? (a, b) => Number(a) - Number(b) : (a, b) => (a < b ? -1 : 1));
  return { group: Uint32Array.from(labels, (l) => levels.indexOf(l)), levels };
}

/** As expectMatch, with NaN here for null there; empty arrays cannot pass for full ones. */
export function expectDefined(actual: unknown, check: Check | undefined, id: string): void {
  if (check === undefined) throw new Error(`no check named ${id}`);
  each(actual, check.value, check, id);
}

function each(actual: unknown, value: Expected, check: Check, id: string): void {
  if (value === null) expect(actual, id).toBeNaN();
  else if (Array.isArray(value)) {
    const list = Array.from(actual as ArrayLike<unknown>);
    expect(list.length, `${id}: length`).toBe(value.length);
    value.forEach((v: Expected, k: number) => {
      each(list[k], v, check, `${id}[${k}]`);
    });
  } else expectMatch(actual, { ...check, value }, id);
}
