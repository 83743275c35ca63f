/**
 * The table the reference check writes: every column type, awkward doubles, empty cells, three files merged into one.
 * Exact in every engine: no transcendental functions, no random numbers.
 */
import type { Batch, Field } from '../../../sim/results/field.js';
import { mergeParquet } from '../../../sim/results/merge.js';
import { ParquetTable } from '../../../sim/results/parquet.js';
import { memoryStore } from '../../../sim/results/store.js';

function field(name: string, type: Field['type'], missing: string | null): Field {
  return { name, type, unit: '', meaning: '', formula: '', missing };
}

export const FIELDS: readonly Field[] = [
  field('arm', 'text', null),
  field('generation', 'integer', null),
  field('wealth', 'number', null),
  field('gap', 'number', 'sometimes'),
  field('pocket', 'integer', 'sometimes'),
  field('role', 'text', 'sometimes'),
  field('frustrated', 'flag', null),
];

const AWKWARD = [-0, 0, 1e300, -1e-300, 5e-324, 1 / 3, 1e21];
const ROWS = [3, 0, 40];

export const BATCHES: readonly Batch[] = ROWS.map((rows, k) => ({
  rows,
  columns: [
    { value: `arm ${k}, "ไทย"` },
    Int32Array.from({ length: rows }, (_, i) => i * 1000 + k),
    Float64Array.from({ length: rows }, (_, i) => AWKWARD[i % AWKWARD.length]),
    Float64Array.from({ length: rows }, (_, i) => (i % 3 === 1 ? Number.NaN : i / 7)),
    Int32Array.from({ length: rows }, (_, i) => (i % 4) - 1),
    { codes: Uint8Array.from({ length: rows }, (_, i) => i % 3), names: ['', 'core', 'fringe'] },
    Uint8Array.from({ length: rows }, (_, i) => i % 2),
  ],
}));

/** The merged file. */
export function sampleFile(): Uint8Array {
  const store = memoryStore();
  const parts = BATCHES.map((batch, k) => {
    const part = new ParquetTable(store.create(`part${k}`), FIELDS);
    part.add(batch);
    part.close();
    return `part${k}`;
  });
  mergeParquet(store, parts, FIELDS, store.create('sample.parquet'));
  return store.read('sample.parquet', 0, store.size('sample.parquet') ?? 0);
}
