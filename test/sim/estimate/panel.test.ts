/**
 * A small results folder, written here in the layout of the folder's contract: read by row group, households joined, and
 * rerun by the scripts in other languages where those are installed.
 */
import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { parquetWriteBuffer } from 'hyparquet-writer';
import { afterAll, describe, expect, test } from 'vitest';
import { drawsCsv, estimatesCsv } from '../../../sim/estimate/output.js';
import { panelSource } from '../../../sim/estimate/panel.js';
import { parsePlan } from '../../../sim/estimate/plan.js';
import { runEstimates } from '../../../sim/estimate/run.js';
import { pythonScript } from '../../../sim/estimate/script-python.js';
import { rScript } from '../../../sim/estimate/script-r.js';
import { memorySource } from '../../../sim/results/bundle.js';
import { openSource } from '../../../sim/results/read.js';
import { luck } from './samples.js';

const ARMS = ['segregated', 'mixed'];
const REPLICATES = 2;
const GENERATIONS = 5;
const N = 80;

interface Table {
  readonly names: string[];
  readonly types: Record<string, 'string' | 'integer' | 'number'>;
  readonly rows: Record<string, string | number | null>[];
}

const { normal, uniform } = luck('results');

const households: Table = {
  names: ['arm', 'replicate', 'household', 'place', 'group', 'degree', 'x_age'],
  types: {
    arm: 'string',
    replicate: 'integer',
    household: 'integer',
    place: 'integer',
    group: 'string',
    degree: 'integer',
    x_age: 'number',
  },
  rows: [],
};
const panel: Table = {
  names: [
    'arm',
    'replicate',
    'generation',
    'household',
    'place',
    'group',
    'wealth',
    'gap',
    'peers',
    'friends',
    'growth',
    'frustrated',
    'isolated',
  ],
  types: {
    ...{
      arm: 'string',
      replicate: 'integer',
      generation: 'integer',
      household: 'integer',
      place: 'integer',
      group: 'string',
    },
    ...{
      wealth: 'number',
      gap: 'number',
      peers: 'number',
      friends: 'number',
      growth: 'number',
      frustrated: 'integer',
      isolated: 'integer',
    },
  },
  rows: [],
};
for (const arm of ARMS) {
  for (let replicate = 0; replicate < REPLICATES; replicate++) {
    const degree = Array.from({ length: N }, () => Math.floor(10 * uniform()));
    for (let household = 0; household < N; household++) {
      households.rows.push({
        ...{ arm, replicate, household, place: household % 16, group: household % 3 ? 'valley' : 'hill, "upper"' },
        ...{ degree: degree[household], x_age: household === 5 ? null : 20 + household / 3 },
      });
    }
    for (let generation = 0; generation < GENERATIONS; generation++) {
      for (let household = 0; household < N; household++) {
        const friends = normal();
        const common = normal();
        const peers = 0.6 * friends + 0.5 * common + 0.5 * normal();
        const gap = normal();
        panel.rows.push({
          ...{
            arm,
            replicate,
            generation,
            household,
            place: household % 16,
            group: household % 3 ? 'valley' : 'hill, "upper"',
          },
          wealth: Math.exp(normal()),
          gap: household === 9 && generation === 2 ? null : gap,
          ...{ peers, friends },
          growth:
            1 +
            0.3 * peers +
            0.2 * gap -
            0.2 * gap * gap +
            0.05 * degree[household] +
            common -
            (arm === 'mixed' ? 0.3 : 0),
          frustrated: uniform() < 1 / (1 + Math.exp(-gap - 0.1 * degree[household])) ? 1 : 0,
          isolated: degree[household] === 0 ? 1 : 0,
        });
      }
    }
  }
}

const bytes = (text: string): Uint8Array<ArrayBuffer> => new TextEncoder().encode(text);

function parquet(table: Table, rowGroupSize: number): Uint8Array<ArrayBuffer> {
  const kind = { string: 'STRING', integer: 'INT32', number: 'DOUBLE' } as const;
  return new Uint8Array(
    parquetWriteBuffer({
      columnData: table.names.map((name) => ({
        name,
        data: table.rows.map((row) => row[name]),
        type: kind[table.types[name]],
      })),
      rowGroupSize,
    }),
  );
}

function csv(table: Table): string {
  const cell = (v: string | number | null): string =>
    v === null ? '' : /[",]/.test(String(v)) ? `"${String(v).replaceAll('"', '""')}"` : String(v);
  return [table.names, ...table.rows.map((row) => table.names.map((name) => row[name]))]
    .map((row) => `${row.map(cell).join(',')}\r\n`)
    .join('');
}

const files = new Map<string, Uint8Array<ArrayBuffer>>([
  [
    'manifest.json',
    bytes(
      JSON.stringify({
        program: 'rungsight',
        state: 'complete',
        seed: 'valley-1',
        arms: ARMS,
        replicates: REPLICATES,
        files: [],
      }),
    ),
  ],
  [
    'codebook.json',
    bytes(
      JSON.stringify({
        resources: [
          ['panel', panel],
          ['households', households],
        ].map(([name, table]) => ({
          name,
          path: `${name as string}.parquet`,
          schema: {
            fields: (table as Table).names.map((field) => ({ name: field, type: (table as Table).types[field] })),
          },
        })),
      }),
    ),
  ],
  // an arm and replicate fills two row groups
  ['panel.parquet', parquet(panel, (N * GENERATIONS) / 2)],
  ['households.parquet', parquet(households, N)],
]);

const PLAN = `estimates:
  - name: Inverted U
    outcome: growth
    covariates: [log_wealth, gap, {square: gap}]
    effects: [place, generation]
    cluster: [place]
    where: {generation: [1, 4], isolated: 0}
    draw: {places: 9, households_per_place: 4}
  - name: Arms compared
    outcome: growth
    covariates: [{dummy: arm}, {product: [{dummy: arm}, {dummy: group}]}, {lag: gap}, degree]
    effects: [generation]
    cluster: [place, household]
  - name: Peers
    method: iv
    outcome: growth
    covariates: [gap, x_age]
    endogenous: [peers]
    instruments: [friends, {square: friends}]
    effects: [place]
    errors: robust
  - name: Frustration and position
    method: logit
    outcome: frustrated
    covariates: [gap, degree, {dummy: group}]
    cluster: [household]
  - name: Frustration within places
    method: logit
    outcome: frustrated
    covariates: [gap, {power: [x_age, 2]}]
    effects: [{product: [place, group]}, generation]
    errors: robust
  - name: Plain
    outcome: log_wealth
    covariates: [{lead: gap}]
    errors: robust-hc3
    where: {group: valley, degree: {from: 2}}
`;

const plan = parsePlan(PLAN, 'plan.yaml');
const results = (async () =>
  runEstimates(plan.estimates, await panelSource(await openSource(memorySource(files)), 'memory'), plan.place))();

describe('a results folder', () => {
  test('gives every arm and replicate, with the households’ own columns', async () => {
    const { estimates, failed } = await results;
    expect(failed).toEqual([]);
    expect(estimates).toHaveLength(5 * ARMS.length * REPLICATES + REPLICATES);
    const peers = estimates.find((e) => e.name === 'Peers');
    expect(peers?.missing).toEqual({ gap: 1, x_age: GENERATIONS });
    expect(peers?.diagnostics.hansen_j?.df).toBe(1);
  });

  test('gives the same from CSV', async () => {
    const codebook = JSON.parse(new TextDecoder().decode(files.get('codebook.json'))) as {
      resources: { path: string }[];
    };
    for (const resource of codebook.resources) resource.path = resource.path.replace('parquet', 'csv');
    const other = new Map(files);
    other.set('codebook.json', bytes(JSON.stringify(codebook)));
    other.set('panel.csv', bytes(csv(panel)));
    other.set('households.csv', bytes(csv(households)));
    const source = await panelSource(await openSource(memorySource(other)), 'memory');
    expect(await runEstimates(plan.estimates, source, plan.place)).toEqual(await results);
  });

  test('reads no more of the panel than it needs', async () => {
    const source = await panelSource(await openSource(memorySource(files)), 'memory');
    const frame = await source.read(['degree', 'gap'], ['mixed'], 1);
    expect(frame.rows).toBe(N * GENERATIONS);
    expect([...frame.columns.keys()].sort()).toEqual(['degree', 'gap']);
    const degree = frame.columns.get('degree') as { values: Float64Array };
    const own = households.rows.filter((row) => row['arm'] === 'mixed' && row['replicate'] === 1);
    expect(degree.values[3 * N + 17]).toBe(own[17]['degree']);
  });
});

describe('scripts in other languages find the same numbers from the folder', () => {
  const folder = mkdtempSync(join(tmpdir(), 'estimate-scripts-'));
  afterAll(() => rmSync(folder, { recursive: true }));
  const write = async (): Promise<void> => {
    const found = await results;
    writeFileSync(join(folder, 'panel.csv'), csv(panel));
    writeFileSync(join(folder, 'households.csv'), csv(households));
    writeFileSync(join(folder, 'estimates.csv'), estimatesCsv(found));
    writeFileSync(join(folder, 'estimates_draws.csv'), drawsCsv(found) ?? '');
    writeFileSync(join(folder, 'panel.py'), pythonScript(plan.estimates));
    writeFileSync(join(folder, 'panel.R'), rScript(plan.estimates));
  };
  const expectSame = (out: string): void => {
    expect(out).not.toContain('not in estimates.csv');
    const furthest = Number(/furthest from estimates\.csv: (\S+)/.exec(out)?.[1]);
    // absorption stops at 1e-10 here and 1e-12 there, in units of a column's length
    expect(furthest).toBeLessThan(1e-7);
    const terms = readFileSync(join(folder, 'estimates.csv'), 'utf8')
      .split('\r\n')
      .filter((line) => line.includes(',coefficient,'));
    expect(out.match(/apart/g)).toHaveLength(terms.length);
  };
  const has = (command: string, args: string[]): boolean => spawnSync(command, args).status === 0;

  test.runIf(has('python3', ['-c', 'import numpy, pandas, scipy']))('Python', async () => {
    await write();
    const run = spawnSync('python3', [join(folder, 'panel.py')], { encoding: 'utf8' });
    expect(run.stderr).toBe('');
    expectSame(run.stdout);
  });

  test.runIf(has('Rscript', ['--version']))('R', async () => {
    await write();
    const run = spawnSync('Rscript', [join(folder, 'panel.R')], { encoding: 'utf8' });
    expect(run.stderr).toBe('');
    expectSame(run.stdout);
  });

  test('carry the plan, quotes and all', () => {
    const odd = parsePlan(`estimates: [{name: "it's \\"odd\\" \\\\ '''", outcome: y, where: {g: "a\\"b"}}]`, 'p.yaml');
    expect(pythonScript(odd.estimates)).toContain('it\'s \\\\"odd\\\\"');
    expect(rScript(odd.estimates)).toContain('name = "it\'s \\"odd\\" \\\\ \'\'\'"');
  });
});
