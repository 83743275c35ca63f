import { parquetWriteBuffer } from 'hyparquet-writer';
import { describe, expect, test } from 'vitest';
import type { InputError } from '../../../network/errors.js';
import type { TextColumn } from '../../../sim/estimate/frame.js';
import { csvFrame, csvSource, parquetSource } from '../../../sim/estimate/table.js';

function problem(run: () => unknown): string {
  try {
    run();
  } catch (error) {
    const [p] = (error as InputError).problems;
    return `${p.code} ${p.place}`;
  }
  return 'none';
}

describe('CSV', () => {
  test('numbers, text, missing values, quotes, line ends, byte order mark', () => {
    const frame = csvFrame('\ufeffa,b,"c ""d"", e",f\r\n1,x,1e-3,NA\r\n,"two\nlines",-Inf,2.5\r\n3,,+.5,\r\n', 't.csv');
    expect(frame.rows).toBe(3);
    expect(frame.columns.get('a')).toEqual({ kind: 'number', values: Float64Array.of(1, NaN, 3) });
    expect(frame.columns.get('b')).toEqual({
      kind: 'text',
      codes: Int32Array.of(0, 1, -1),
      levels: ['x', 'two\nlines'],
    });
    expect(frame.columns.get('c "d", e')).toEqual({ kind: 'number', values: Float64Array.of(0.001, -Infinity, 0.5) });
    expect(frame.columns.get('f')).toEqual({ kind: 'number', values: Float64Array.of(NaN, 2.5, NaN) });
  });

  test('a column with any other text is text', () => {
    expect(csvFrame('a,b\n1,0x1F\n2,7\n', 't.csv').columns.get('b')?.kind).toBe('text');
    expect(csvFrame('a,b\n1,NA\n2,north\n', 't.csv').columns.get('b')?.kind).toBe('text');
  });

  test('a table larger than a piece reads the same', () => {
    const rows = 60_000;
    const far = ', far along the valley road beyond the second bridge and the mill by the river';
    let text = 'i,name\n';
    for (let i = 0; i < rows; i++) text += `${i},"place ${i % 7}${far}"\n`;
    const frame = csvFrame(text, 't.csv');
    expect(text.length).toBeGreaterThan(4 << 20);
    expect(frame.rows).toBe(rows);
    const i = frame.columns.get('i') as { values: Float64Array };
    expect(i.values.every((v, r) => v === r)).toBe(true);
    expect((frame.columns.get('name') as TextColumn).levels).toHaveLength(7);
  });

  test.each([
    ['', 'empty-table t.csv'],
    ['a,b\n', 'empty-table t.csv'],
    ['a,a\n1,2\n', 'duplicate-column t.csv row 1'],
    ['a,\n1,2\n', 'bad-csv t.csv row 1'],
    ['a,b\n1,2\n1\n', 'ragged-row t.csv row 3'],
    ['a,b\n1,"2\n3,4\n', 'bad-csv t.csv row 2'],
  ])('%j is refused', (text, expected) => {
    expect(problem(() => csvFrame(text, 't.csv'))).toBe(expected);
  });
});

describe('Parquet', () => {
  const buffer = parquetWriteBuffer({
    columnData: [
      { name: 'arm', data: ['a', 'a', 'b', 'b'], type: 'STRING' },
      { name: 'n', data: [1, 2, 3, 4], type: 'INT32' },
      { name: 'big', data: [1n, 2n, 3n, 4n], type: 'INT64' },
      { name: 'x', data: [0.5, null, 1.5, -2], type: 'DOUBLE' },
      { name: 'yes', data: [true, false, true, true], type: 'BOOLEAN' },
      { name: 'word', data: ['p', null, 'q', 'p'], type: 'STRING' },
    ],
    rowGroupSize: 3,
  });

  test('reads the columns named, by arm', async () => {
    const source = await parquetSource(buffer, 't.parquet');
    expect(source.arms).toEqual(['a', 'b']);
    expect(source.replicates).toBeNull();
    expect(source.kinds.get('yes')).toBe('number');
    const all = await source.read(['x', 'big', 'yes', 'word'], null, null);
    expect(all.columns.get('x')).toEqual({ kind: 'number', values: Float64Array.of(0.5, NaN, 1.5, -2) });
    expect(all.columns.get('big')).toEqual({ kind: 'number', values: Float64Array.of(1, 2, 3, 4) });
    expect(all.columns.get('yes')).toEqual({ kind: 'number', values: Float64Array.of(1, 0, 1, 1) });
    expect(all.columns.get('word')).toEqual({ kind: 'text', codes: Int32Array.of(0, -1, 1, 0), levels: ['p', 'q'] });
    const b = await source.read(['n'], ['b'], null);
    expect(b.columns.get('n')).toEqual({ kind: 'number', values: Float64Array.of(3, 4) });
  });

  test('what is no Parquet is refused', async () => {
    const bytes = new TextEncoder().encode('not at all a parquet file').buffer;
    await expect(parquetSource(bytes, 't.parquet')).rejects.toThrow(/cannot be read as Parquet/);
  });
});

test('a table without arms is one block', async () => {
  const source = csvSource('y,x\n1,2\n2,3\n', 't.csv');
  expect(source.arms).toBeNull();
  expect((await source.read(['y'], null, null)).rows).toBe(2);
});
