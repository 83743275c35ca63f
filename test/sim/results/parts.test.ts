/** The tables of a whole run, put together from parts: every row, in order, in both formats; thinned as asked. */

import { unzipSync } from 'fflate';
import { describe, expect, test } from 'vitest';
import { bundle, memorySource, zipFiles } from '../../../sim/results/bundle.js';
import { PanelSource, panelColumns } from '../../../sim/results/columns.js';
import type { Facts } from '../../../sim/results/facts.js';
import { cellAt } from '../../../sim/results/field.js';
import { PartWriter } from '../../../sim/results/parts.js';
import { openSource, type Results, type TableData } from '../../../sim/results/read.js';
import { ROW_GROUP, RowGroupBuffer } from '../../../sim/results/row-group.js';
import { memoryStore } from '../../../sim/results/store.js';
import type { Format } from '../../../sim/results/tables.js';
import { type KeepPanel, keptHouseholds } from '../../../sim/results/thin.js';
import type { ArmRecord } from '../../../sim/study/record.js';
import { FACTS, type FakeRun, fakeRows, playArm, writeReplicate } from './fake-run.js';

const RUN: FakeRun = { n: 40, generations: 5, arms: ['segregated', 'mixed, "half"'], replicates: 3, tiesChange: true };

type Cells = (number | string | null)[];

async function files(
  run: FakeRun,
  formats: readonly Format[],
  keep: KeepPanel,
  facts: Facts = FACTS,
): Promise<ReadonlyMap<string, Uint8Array<ArrayBuffer>>> {
  const store = memoryStore();
  // replicates end in any order
  for (let r = run.replicates - 1; r >= 0; r--) {
    writeReplicate(run, r, new PartWriter({ store, facts, formats, keep, replicate: r }));
  }
  return bundle(store, {
    head: {
      version: '1.2.3',
      study: 'Two valleys',
      studyHash: 'abc',
      seed: 'valley-1',
      arms: run.arms,
      replicates: run.replicates,
      generations: run.generations,
      households: run.n,
      started: '2026-01-01T00:00:00Z',
    },
    studyYaml: 'study: Two valleys\n',
    facts,
    formats,
    tables: [{ name: 'incidence', rows: [{ arm: 'segregated', generation: 0, percentile: 5, growth: 1.5 }] }],
    end: { seconds: 1, peakMemory: 2 },
  });
}

async function opened(
  run: FakeRun,
  formats: readonly Format[],
  keep: KeepPanel,
  facts: Facts = FACTS,
): Promise<Results> {
  return openSource(memorySource(await files(run, formats, keep, facts)));
}

/** The rows the panel should have, straight from the run. */
function panelRows(run: FakeRun, keep: (replicate: number, generation: number, household: number) => boolean): Cells[] {
  const columns = panelColumns(FACTS);
  const rows: Cells[] = [];
  for (let arm = 0; arm < run.arms.length; arm++) {
    for (let r = 0; r < run.replicates; r++) {
      let source: PanelSource | null = null;
      playArm(run, arm, r, {
        starts: (record) => {
          source = new PanelSource(record);
        },
        generation: (record, extras) => {
          if (!record.decided || source === null) return;
          const context = source.context(record, extras);
          const filled = columns.map((column) => column.fill(context));
          for (let i = 0; i < run.n; i++) {
            if (keep(r, record.generation, i)) rows.push(filled.map((column) => cellAt(column, i)));
          }
        },
        ends: () => {},
      });
    }
  }
  return rows;
}

function rowsOf(table: TableData): Cells[] {
  return Array.from({ length: table.rows }, (_, i) => table.names.map((name) => cellAt(table.columns[name], i)));
}

function expectRows(table: TableData, want: Cells[]): void {
  expect(table.rows).toBe(want.length);
  const got = rowsOf(table);
  for (let i = 0; i < want.length; i++) {
    for (let c = 0; c < want[i].length; c++) {
      if (!Object.is(got[i][c], want[i][c])) {
        throw new Error(`row ${i} ${table.names[c]}: expected ${want[i][c]}, read ${got[i][c]}`);
      }
    }
  }
}

async function panelOf(results: Results): Promise<TableData> {
  const panel = await results.panel();
  if (panel === null) throw new Error('no panel');
  return panel.read();
}

describe('the panel', () => {
  test.each([['parquet'], ['csv']] as const)('has every row in order in %s', async (format) => {
    const results = await opened(RUN, [format], 'all');
    const table = await panelOf(results);
    expect(table.names).toEqual(panelColumns(FACTS).map(({ name }) => name));
    expectRows(
      table,
      panelRows(RUN, () => true),
    );
  });

  test('keeps what a thinned study asks for: first replicates, every second generation, households spread evenly', async () => {
    const results = await opened(RUN, ['parquet'], { replicates: 2, every: 2, households: 10 });
    // 10 of 40: the middles of ten stretches of four
    const kept = new Set([2, 6, 10, 14, 18, 22, 26, 30, 34, 38]);
    expectRows(
      await panelOf(results),
      panelRows(RUN, (r, t, i) => r < 2 && t % 2 === 0 && kept.has(i)),
    );
    // thinning the panel leaves the other tables whole
    expect((await results.table('households'))?.rows).toBe(2 * 3 * 40);
    expect((await results.table('indicators'))?.rows).toBe(2 * 3 * 6);
  });

  test('is not there when the study keeps none', async () => {
    const out = await files(RUN, ['parquet', 'csv'], 'none');
    expect([...out.keys()].filter((name) => name.startsWith('panel'))).toEqual([]);
    const results = await openSource(memorySource(out));
    expect(await results.panel()).toBeNull();
    expect((await results.table('ties'))?.rows).toBeGreaterThan(0);
  });

  test('is read in pieces: arms, replicates, generations, columns', async () => {
    for (const format of ['parquet', 'csv'] as const) {
      const panel = await (await opened(RUN, [format], 'all')).panel();
      if (panel === null) throw new Error('no panel');
      const columns = ['generation', 'replicate', 'household', 'wealth', 'group', 'pocket_role'];
      const piece = await panel.read({ arms: [RUN.arms[1]], replicates: [0, 2], generations: [1, 3], columns });
      const all = panelColumns(FACTS).map(({ name }) => name);
      const want = panelRows(RUN, (r, t) => r !== 1 && t >= 1 && t <= 3)
        .filter((row) => row[0] === RUN.arms[1])
        .map((row) => columns.map((name) => row[all.indexOf(name)]));
      expect(piece.names).toEqual(columns);
      expectRows(piece, want);
      await expect(panel.read({ columns: ['welth'] })).rejects.toThrow('there is no column welth');
    }
  });

  test('has row groups of whole generations of one arm and replicate, named in the footer', async () => {
    const run: FakeRun = { n: 22000, generations: 3, arms: ['a'], replicates: 1, plain: true };
    const results = await opened(run, ['parquet'], 'all', { ...FACTS, betweenness: false });
    const panel = await results.panel();
    if (panel === null) throw new Error('no panel');
    // three generations would be 66,000 rows, more than 65,536
    expect(panel.groups?.map(({ arm, replicate, from, to, rows }) => [arm, replicate, from, to, rows])).toEqual([
      ['a', 0, 0, 1, 44000],
      ['a', 0, 2, 2, 22000],
    ]);
    const { rows, columns } = await panel.read({
      generations: [1, 1],
      columns: ['household', 'wealth'],
    });
    expect(rows).toBe(22000);
    const wrong = [...(columns['household'] as Int32Array)].findIndex((household, i) => household !== i);
    expect(wrong).toBe(-1);
    expect(cellAt(columns['wealth'], 21999)).toBe(22000);
  });
});

describe('row groups', () => {
  test('a generation larger than a row group is one row group', () => {
    expect(ROW_GROUP).toBe(65536);
    const fields = panelColumns(FACTS).slice(1, 2);
    const buffer = new RowGroupBuffer(fields, 100_000);
    buffer.add([{ value: 1 }], 100_000, null);
    expect(buffer.full).toBe(true);
    expect(buffer.take().rows).toBe(100_000);
    expect(buffer.full).toBe(false);
  });

  test('households kept are as many as asked, different, and evenly spread', () => {
    for (const [n, h] of [
      [10, 3],
      [1000, 999],
      [7, 1],
      [50, 49],
    ]) {
      const kept = [...(keptHouseholds({ households: h }, n) ?? [])];
      expect(new Set(kept).size).toBe(h);
      const gaps = kept.slice(1).map((k, i) => k - kept[i]);
      expect(Math.max(...gaps, 1) - Math.min(...gaps, Math.max(...gaps, 1))).toBeLessThanOrEqual(1);
      expect(kept[0]).toBeGreaterThanOrEqual(0);
      expect(kept.at(-1)).toBeLessThan(n);
    }
    expect(keptHouseholds({ households: 10 }, 10)).toBeNull();
  });
});

describe('the other tables', () => {
  test('households have their labels, network position and covariates', async () => {
    const results = await opened(RUN, ['parquet', 'csv'], 'all');
    const table = await results.table('households');
    if (table === null) throw new Error('no households');
    const records: ArmRecord[] = [];
    for (let arm = 0; arm < 2; arm++) {
      for (let r = 0; r < 3; r++) {
        playArm(RUN, arm, r, { starts: (record) => records.push(record), generation: () => {}, ends: () => {} });
      }
    }
    expect(table.rows).toBe(records.length * RUN.n);
    const cell = (name: string, row: number): number | string | null => cellAt(table.columns[name], row);
    records.forEach((record, block) => {
      for (let i = 0; i < RUN.n; i++) {
        const row = block * RUN.n + i;
        const degree = record.ties.start[i + 1] - record.ties.start[i];
        expect([cell('arm', row), cell('replicate', row), cell('household', row)]).toEqual([
          record.arm,
          record.replicate,
          i,
        ]);
        expect([cell('degree', row), cell('strength', row)]).toEqual([degree, degree]);
        expect(cell('clustering', row) === null).toBe(degree < 2);
        expect(cell('place_name', row)).toBe(record.placeNames?.[i % 3]);
        expect(Object.is(cell('child_weight', row), record.households.childWeight[i])).toBe(true);
        expect(cell('treated', row)).toBe(record.treated === null ? 0 : record.treated[i]);
        expect(cell('x_age', row)).toBe(i % 4 === 0 ? null : 20 + i);
        expect(cell('x_language', row)).toBe(i % 3 === 0 ? null : `tongue ${i % 2}`);
      }
    });
  });

  test('ties stand from their first to their last generation', async () => {
    const results = await opened(RUN, ['csv'], 'all');
    const table = await results.table('ties');
    if (table === null) throw new Error('no ties');
    const rows = rowsOf(table);
    for (let arm = 0; arm < 2; arm++) {
      for (let r = 0; r < 3; r++) {
        const own = rows.filter((row) => row[0] === RUN.arms[arm] && row[1] === r) as [string, ...number[]][];
        playArm(RUN, arm, r, {
          starts: () => {},
          generation: ({ generation, ties, decided }) => {
            if (!decided) return;
            const want: string[] = [];
            for (let i = 0; i < ties.n; i++) {
              for (let e = ties.start[i]; e < ties.start[i + 1]; e++)
                if (ties.target[e] > i) want.push(`${i}-${ties.target[e]}`);
            }
            const got = own
              .filter((row) => row[2] <= generation && row[3] >= generation)
              .map((row) => `${row[4]}-${row[5]}`);
            expect(got.sort()).toEqual(want.sort());
          },
          ends: () => {},
        });
      }
    }
  });

  test('indicators and pockets come arm by arm and replicate by replicate', async () => {
    const results = await opened(RUN, ['parquet'], 'all');
    const indicators = await results.table('indicators');
    const want: Cells[] = [];
    for (const arm of RUN.arms) {
      for (let r = 0; r < 3; r++) {
        for (let t = 0; t <= 5; t++) {
          const { gini, modes } = fakeRows(t, r).indicators[0];
          want.push([arm, r, t, gini as number, (modes ?? null) as number | null]);
        }
      }
    }
    expectRows(indicators!, want);
    expect((await results.table('pockets'))?.rows).toBe(2 * 3 * 3);
    expect((await results.table('regimes'))?.rows).toBe(6);
    expect((await results.table('frustration'))?.rows).toBe(0);
    expect((await results.table('incidence'))?.rows).toBe(1);
  });
});

describe('part writers', () => {
  test('refuse measured columns that are not handed over', () => {
    const writer = new PartWriter({ store: memoryStore(), facts: FACTS, formats: ['csv'], keep: 'all', replicate: 0 });
    expect(() =>
      playArm(RUN, 0, 0, {
        starts: (record) => writer.armStarts(record),
        generation: (record) => writer.generation(record),
        ends: () => writer.armEnds(),
      }),
    ).toThrow('the panel has a column pocket but its values were not handed over');
  });
});

test('a ZIP holds the files, and the same files give the same ZIP', async () => {
  const out = await files(RUN, ['parquet'], 'all');
  const zip = zipFiles('two-valleys', out);
  expect(Buffer.compare(zipFiles('two-valleys', out), zip)).toBe(0);
  const back = unzipSync(zip);
  expect(Object.keys(back).sort()).toEqual([...out.keys()].map((name) => `two-valleys/${name}`).sort());
  for (const [name, bytes] of out) expect(Buffer.compare(back[`two-valleys/${name}`], bytes)).toBe(0);
});
