/** Every kind of value through Parquet and CSV and back: the same doubles, the same empty cells, the same text. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { memorySource } from '../../../sim/results/bundle.js';
import type { Codebook } from '../../../sim/results/codebook.js';
import { codebook } from '../../../sim/results/codebook.js';
import { csvHeader, numberCell, writeCsvRows, writeCsvTable } from '../../../sim/results/csv.js';
import { type Batch, cellAt, columnsOf, type Field, type FieldType } from '../../../sim/results/field.js';
import type { Manifest } from '../../../sim/results/manifest.js';
import { mergeParquet } from '../../../sim/results/merge.js';
import { ParquetTable } from '../../../sim/results/parquet.js';
import { Results, type TableData } from '../../../sim/results/read.js';
import { CsvReader, parseNumber } from '../../../sim/results/read-csv.js';
import { memoryStore } from '../../../sim/results/store.js';
import type { Table } from '../../../sim/results/tables.js';
import { AWKWARD } from './fake-run.js';

function field(name: string, type: FieldType, missing: string | null): Field {
  return { name, type, unit: '', meaning: 'm', formula: 'f', missing };
}

const FIELDS: Field[] = [
  field('number', 'number', null),
  field('maybe_number', 'number', 'sometimes'),
  field('integer', 'integer', null),
  field('maybe_integer', 'integer', 'sometimes'),
  field('flag', 'flag', null),
  field('text', 'text', null),
  field('maybe_text', 'text', 'sometimes'),
  field('same', 'text', null),
  field('never', 'number', 'always'),
  field('never_text', 'text', 'always'),
];

const table: Table = {
  name: 'panel',
  title: 'Panel',
  rowPer: 'row',
  key: [],
  formats: 'kept',
  made: 'parts',
  fields: FIELDS,
};

/** Writes batches in one format and reads them back by the codebook. */
async function roundTrip(format: 'parquet' | 'csv', batches: readonly Batch[]): Promise<TableData> {
  const store = memoryStore();
  if (format === 'parquet') {
    // each batch in a file of its own, so that merging is part of the trip
    const names = batches.map((batch, k) => {
      const part = new ParquetTable(store.create(`part${k}`), FIELDS);
      part.add(batch);
      part.close();
      return `part${k}`;
    });
    mergeParquet(store, names, FIELDS, store.create('panel.parquet'));
  } else {
    const sink = store.create('panel.csv');
    sink.write(csvHeader(FIELDS));
    for (const batch of batches) writeCsvRows(sink, FIELDS, batch);
    sink.close();
  }
  const book = codebook({ title: 't', version: '0', tables: [table], files: store.list('panel') });
  const results = new Results(memorySource(store.files), {} as Manifest, JSON.parse(book.json) as Codebook);
  const back = await results.table('panel');
  if (back === null) throw new Error('no panel');
  return back;
}

function expectSame(back: TableData, batches: readonly Batch[]): void {
  expect(back.names).toEqual(FIELDS.map(({ name }) => name));
  expect(back.rows).toBe(batches.reduce((sum, batch) => sum + batch.rows, 0));
  for (let c = 0; c < FIELDS.length; c++) {
    let at = 0;
    for (const batch of batches) {
      for (let i = 0; i < batch.rows; i++, at++) {
        const want = cellAt(batch.columns[c], i);
        const got = cellAt(back.columns[FIELDS[c].name], at);
        if (!Object.is(got, want)) throw new Error(`${FIELDS[c].name} row ${at}: wrote ${want}, read ${got}`);
      }
    }
  }
}

const anyDouble = fc.oneof(fc.double({ noNaN: true }), fc.constantFrom(...AWKWARD));
const anyText = fc.oneof(
  fc.string({ unit: 'grapheme', minLength: 1 }),
  fc.constantFrom('a,b', '"', 'a\r\nb', ' ', 'ไทย'),
);
const anyRow = fc.record({
  number: anyDouble,
  maybe_number: fc.option(anyDouble),
  integer: fc.nat(0x7fffffff),
  maybe_integer: fc.option(fc.nat()),
  flag: fc.nat(1),
  text: anyText,
  maybe_text: fc.option(anyText),
  same: fc.constant('same'),
});

describe.each(['parquet', 'csv'] as const)('%s', (format) => {
  test('gives back any rows, in pieces of any size, to the bit', async () => {
    await fc.assert(
      fc.asyncProperty(fc.array(fc.array(anyRow, { maxLength: 12 }), { maxLength: 4 }), async (pieces) => {
        const batches = pieces.map((rows) => columnsOf(FIELDS, rows));
        expectSame(await roundTrip(format, batches), batches);
      }),
      { numRuns: 60 },
    );
  });

  test('keeps −0 apart from 0 where a column has few different values', async () => {
    const rows = Array.from({ length: 5000 }, (_, i) => ({
      number: i % 2 === 0 ? -0 : 0,
      maybe_number: i % 3 === 0 ? null : -0,
      integer: i,
      flag: 1,
      text: `name ${i % 7}`,
      same: 's',
    }));
    const batches = [columnsOf(FIELDS, rows)];
    expectSame(await roundTrip(format, batches), batches);
  });

  test('gives back columns long enough for several pages', async () => {
    const rows = 200_000;
    const number = Float64Array.from({ length: rows }, (_, i) => Math.sqrt(i));
    const same = { value: 1 };
    const text = { value: 'x' };
    const none = { value: null };
    const columns = [number, number, same, none, same, text, none, text, none, none];
    expectSame(await roundTrip(format, [{ rows, columns }]), [{ rows, columns }]);
  });

  test('takes an empty text for an empty cell', async () => {
    const { columns } = columnsOf(FIELDS, [{ number: 1, integer: 1, flag: 1, text: 'a', same: 's' }]);
    const batch = { rows: 1, columns: [...columns] };
    batch.columns[6] = { codes: Uint8Array.of(0), names: ['', 'core'] };
    batch.columns[9] = { value: '' };
    const back = await roundTrip(format, [batch]);
    expect([cellAt(back.columns['maybe_text'], 0), cellAt(back.columns['never_text'], 0)]).toEqual([null, null]);
    batch.columns[5] = { codes: Uint8Array.of(0), names: [''] };
    await expect(roundTrip(format, [batch])).rejects.toThrow('text is never empty');
  });

  test('gives back a table without rows', async () => {
    const batches = [columnsOf(FIELDS, [])];
    expectSame(await roundTrip(format, batches), batches);
  });

  test('refuses an empty cell where the field says there is none', async () => {
    const batch = columnsOf(FIELDS, [{ number: NaN, integer: 1, flag: 0, text: 'a', same: 's' }]);
    await expect(roundTrip(format, [batch])).rejects.toThrow('number is never empty, yet has no value in row 0');
  });
});

describe('cells', () => {
  test('numbers are written with the fewest digits that read back', () => {
    expect(AWKWARD.map(numberCell)).toEqual([
      '-0',
      '0',
      '1e+300',
      '-1e+300',
      '5e-324',
      '2.2250738585072014e-308',
      '0.1',
      '0.3333333333333333',
      '1e+21',
      '123456789012345680000',
    ]);
    expect([Infinity, -Infinity, NaN].map(numberCell)).toEqual(['INF', '-INF', '']);
    for (const v of [...AWKWARD, Infinity, -Infinity, NaN]) expect(parseNumber(numberCell(v))).toBe(v);
  });

  test('rows of small tables are checked', () => {
    expect(() => columnsOf(FIELDS, [{ mistyped: 1 }])).toThrow('no column mistyped');
    expect(() => columnsOf(FIELDS, [{ integer: 1.5 }])).toThrow('integer must be an integer');
    expect(() => columnsOf(FIELDS, [{ integer: -1 }])).toThrow('integer must be an integer');
    expect(() => columnsOf(FIELDS, [{ number: '1' }])).toThrow('number must be a number, got "1"');
  });

  test('a CSV file is as RFC 4180 has it', () => {
    const store = memoryStore();
    const fields = [field('a', 'text', null), field('b', 'number', 'x')];
    writeCsvTable(store, 't.csv', fields, [{ a: 'say "yes", twice', b: 0.5 }, { a: 'two\nlines' }]);
    expect(new TextDecoder().decode(store.files.get('t.csv'))).toBe(
      'a,b\r\n"say ""yes"", twice",0.5\r\n"two\nlines",\r\n',
    );
  });

  test('CSV reads the same however it is cut into pieces', () => {
    const text = 'a,b\r\n"x ""y""\r\n, z",1\n,\r\n"",-0\r\nlast,2';
    const want = [
      ['a', 'b'],
      ['x "y"\r\n, z', '1'],
      ['', ''],
      ['', '-0'],
      ['last', '2'],
    ];
    fc.assert(
      fc.property(fc.array(fc.nat(text.length)), (cuts) => {
        const rows: string[][] = [];
        const reader = new CsvReader((cells) => rows.push(cells));
        let at = 0;
        for (const cut of [...cuts, text.length].sort((a, b) => a - b)) {
          reader.push(text.slice(at, cut));
          at = cut;
        }
        reader.end();
        expect(rows).toEqual(want);
      }),
    );
  });
});
