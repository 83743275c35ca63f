/**
 * Parquet files read by another program: Apache Arrow (pyarrow, version in read.json) read this very file, to the byte,
 * and saw these values. When the bytes change on purpose, read.py says how to have them read again.
 */
import { createHash } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, test } from 'vitest';
import { cellAt } from '../../sim/results/field.js';
import { BATCHES, FIELDS, sampleFile } from './parquet/sample.js';

interface Read {
  readonly sha256: string;
  readonly types: Readonly<Record<string, readonly [string, boolean]>>;
  readonly groups: readonly { rows: number; bounds: Readonly<Record<string, readonly unknown[]>> }[];
  readonly columns: Readonly<Record<string, readonly (string | number | null)[]>>;
}

const read = JSON.parse(readFileSync(join(import.meta.dirname, 'parquet', 'read.json'), 'utf8')) as Read;

/** A double from its hexadecimal form in Python, `-0x1.8p+1`: exact, both factors are doubles. */
function fromHex(text: string): number {
  const [, sign, whole, fraction, exponent] = /^(-?)0x([01])\.([0-9a-f]+)p([+-]\d+)$/.exec(text) ?? [];
  if (exponent === undefined) throw new Error(`not a hexadecimal double: ${text}`);
  const digits = Number.parseInt(whole + fraction, 16);
  // in two steps: 2^−1074 is a double, 2^−1126 is not
  const power = Number(exponent);
  const value = digits * 2 ** (-4 * fraction.length) * 2 ** power;
  return sign === '-' ? -value : value;
}

describe('a merged file as Apache Arrow reads it', () => {
  test('is the file this code writes', () => {
    expect(createHash('sha256').update(sampleFile()).digest('hex')).toBe(read.sha256);
  });

  test('has every value to the bit and every empty cell', () => {
    FIELDS.forEach((field, c) => {
      const want = BATCHES.flatMap((batch) => Array.from({ length: batch.rows }, (_, i) => cellAt(batch.columns[c], i)));
      const got = read.columns[field.name].map((value) =>
        field.type === 'number' && typeof value === 'string' ? fromHex(value) : value,
      );
      expect(got.length).toBe(43);
      got.forEach((value, i) => {
        if (!Object.is(value, want[i])) throw new Error(`${field.name} row ${i}: wrote ${want[i]}, Arrow read ${value}`);
      });
    });
  });

  test('has its types, and bounds by which row groups can be skipped', () => {
    expect(read.types).toEqual({
      arm: ['string', false],
      generation: ['int32', false],
      wealth: ['double', false],
      gap: ['double', true],
      pocket: ['int32', true],
      role: ['string', true],
      frustrated: ['int32', false],
    });
    expect(read.groups.map(({ rows }) => rows)).toEqual([3, 40]);
    expect(read.groups.map(({ bounds }) => [bounds['arm'], bounds['generation'], bounds['pocket']])).toEqual([
      [['arm 0, "ไทย"', 'arm 0, "ไทย"', 0], [0, 2000, 0], [0, 1, 1]],
      [['arm 2, "ไทย"', 'arm 2, "ไทย"', 0], [2, 39002, 0], [0, 2, 10]],
    ]);
  });
});
