/**
 * A study run in the page gives the bytes the command line gives, says how far it is, and can be stopped.
 *
 * The command line is the built one (`npm run build:sim`), started as a user would.
 */
import { execFileSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import { type Dirent, existsSync, mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join, relative } from 'node:path';
import { fileURLToPath } from 'node:url';
import type { Browser, Page } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { SAMPLE } from '../viewer/sheet/sample.js';
import { type BuiltPage, builtPage } from './built-page.js';
import { launch } from './chromium.js';
import type { RunPage, Told } from './pages/run.js';

const COMMAND = fileURLToPath(new URL('../../dist/sim/command/main.js', import.meta.url));

/** A study small enough to run many times. */
const SMALL = `${SAMPLE.replace('households: 300', 'households: 120').replace(', within_group: 0.8', '')}pockets: {permutations: 19}\n`;

/** Drawn households, both formats. */
const DRAWN = `${SMALL.replace('replicates: 4', 'replicates: 2')}keep: {formats: [parquet, csv]}\n`;

/** Households and ties of files, invented: a ring of forty in two places. */
const PEOPLE = ['household,wealth,place,group,x_land']
  .concat(
    Array.from({ length: 40 }, (_, i) => `h${i},${10 + ((i * 37) % 90)},p${i % 2},${i % 3 === 0 ? 'up' : 'low'},${i}`),
  )
  .join('\n');
const TIES = ['source,target']
  .concat(Array.from({ length: 40 }, (_, i) => [`h${i},h${(i + 1) % 40}`, `h${i},h${(i + 2) % 40}`]).flat())
  .join('\n');
const OBSERVED = `study: Observed ring
seed: ring
replicates: 2
generations: 4
population: {households_file: people.csv}
technology: {kind: concave, scale: 8, elasticity: 0.6}
shock: {sd_log: 0.3, shared_by_place: 0.2, risk: expected}
preferences: {curvature: 0.6, child_weight: 0.5, child_weight_spread: 0.2}
reference:
  persistence: 0.2
  milestones:
    - {weight: 1, mix: [{from: neighbours, statistic: similarity_mean, window: 0.5, weight: 0.8}, {from: society, weight: 0.2}]}
    - {weight: 0.5, scale: 1.5, mix: [{from: second_circle, statistic: quantile, q: 0.9, weight: 1}]}
arms:
  - {name: observed, network: {kind: file, path: ties.csv}}
  - {name: mixed, network: {from: observed, mixing: {share: 0.6}}}
keep: {local_moran: true}
estimates:
  - {name: growth on wealth, outcome: {log: growth}, covariates: [log_wealth, neighbour_mean_growth], effects: [generation], cluster: [place]}
`;

let site: BuiltPage;
let browser: Browser;
let page: Page;
let folder: string;

beforeAll(async () => {
  if (!existsSync(COMMAND)) throw new Error('build the command first: npm run build:sim');
  folder = mkdtempSync(join(tmpdir(), 'rungsight-run-'));
  [site, browser] = await Promise.all([builtPage('run'), launch()]);
  page = await browser.newPage();
  await page.goto(site.url);
});
afterAll(async () => {
  await browser?.close();
  await site?.close();
  rmSync(folder, { recursive: true, force: true });
});

/** Digests of what the command line writes. */
function commandLine(name: string, yaml: string, files: Readonly<Record<string, string>>): Record<string, string> {
  for (const [file, text] of Object.entries(files)) writeFileSync(join(folder, file), text);
  const study = join(folder, `${name}.yaml`);
  writeFileSync(study, yaml);
  const out = join(folder, name);
  execFileSync(process.execPath, [COMMAND, 'run', study, '--out', out, '--threads', '2', '--json'], { stdio: 'pipe' });
  return Object.fromEntries(
    (readdirSync(out, { recursive: true, withFileTypes: true }) as Dirent[])
      .filter((entry) => entry.isFile())
      .map((entry) => relative(out, join(entry.parentPath, entry.name)))
      .map((file) => [
        file,
        createHash('sha256')
          .update(readFileSync(join(out, file)))
          .digest('hex'),
      ]),
  );
}

function inPage(
  yaml: string,
  files: Readonly<Record<string, string>>,
  workers: number,
  cancelAt?: number,
): Promise<Told> {
  return page.evaluate(
    ([text, named, count, cancel]) =>
      (window as unknown as { page: RunPage }).page.run(text, named, count, cancel ?? undefined),
    [yaml, files, workers, cancelAt ?? null] as const,
  );
}

describe('the bytes of a run in the page', () => {
  // all but the manifest, which tells of the machine and the moment
  test.each([
    ['drawn', DRAWN, {}],
    ['observed', OBSERVED, { 'people.csv': PEOPLE, 'ties.csv': TIES }],
  ])('are those of the command line: %s households', async (name, yaml, files) => {
    const expected = commandLine(name, yaml, files);
    const told = await inPage(yaml, files, 1);
    expect(told.problems).toEqual([]);
    expect(told.failed).toBeNull();
    delete expected['manifest.json'];
    const made: Record<string, string> = { ...told.digests };
    expect(Object.fromEntries(Object.keys(expected).map((file) => [file, made[file]]))).toEqual(expected);
    expect(Object.keys(made)).toEqual(
      expect.arrayContaining(['panel.parquet', 'ties.parquet', 'indicators.csv', 'study.yaml']),
    );
    expect(Object.keys(made)).toContain('report.html');
    if (yaml.includes('estimates:')) expect(Object.keys(made)).toContain('estimates.csv');
    if ('panel.csv' in expected) {
      // saved as CSV from the source: the same again
      expect(await page.evaluate(() => (window as unknown as { page: RunPage }).page.savedCsv())).toBe(
        expected['panel.csv'],
      );
    }
  });

  test('do not depend on the number of workers, nor does CSV made of a panel kept as Parquet', async () => {
    const yaml = SMALL.replace('replicates: 4', 'replicates: 3');
    const one = await inPage(yaml, {}, 1);
    const three = await inPage(yaml, {}, 3);
    const { 'manifest.json': _, ...first } = one.digests;
    const { 'manifest.json': __, ...second } = three.digests;
    expect(second).toEqual(first);
    const csv = await inPage(`${yaml}keep: {formats: [csv]}\n`, {}, 2);
    await inPage(yaml, {}, 2);
    expect(await page.evaluate(() => (window as unknown as { page: RunPage }).page.savedCsv())).toBe(
      csv.digests['panel.csv'],
    );
  });
});

describe('while it runs', () => {
  test('the first replicate can be looked at before the rest is there, and says the same then and later', async () => {
    const told = await inPage(SMALL.replace('replicates: 4', 'replicates: 3'), {}, 2);
    expect(told.arrived[0]).toEqual([1, false]);
    expect(told.arrived.at(-1)).toEqual([3, true]);
    const shares = await page.evaluate(async () => {
      const { page: run } = window as unknown as { page: RunPage };
      return [await run.frustrated(0, 0, 3), await run.frustrated(1, 2, 0)];
    });
    for (const count of shares) expect(count).toBeGreaterThanOrEqual(0);
  });

  test('progress never falls, ends in the tables, and tells time and rate', async () => {
    const told = await inPage(SMALL.replace('households: 120', 'households: 600'), {}, 1);
    const shares = told.progress.map(([share]) => share);
    expect([...shares].sort((a, b) => a - b)).toEqual(shares);
    expect(told.progress.at(-1)![1]).toBe('writing the tables');
    expect(
      told.progress.some(([, doing]) => /\d left\n.*household-generations\/s$/s.test(doing) || /s left\n/.test(doing)),
    ).toBe(true);
  });

  test('it stops at once and says nothing more', async () => {
    const told = await inPage(SMALL.replace('households: 120', 'households: 3000'), {}, 2, 0.05);
    expect(told.arrived.filter(([, whole]) => whole)).toEqual([]);
    expect(told.progress.at(-1)![0]).toBeLessThan(0.9);
  });
});

describe('what goes wrong', () => {
  test('in the study is told with line and column', async () => {
    const told = await inPage(SMALL.replace('curvature: 0.6', 'curvature: -1'), {}, 1);
    expect(told.problems).toMatchObject([{ code: 'out-of-range', place: 'study:23:14' }]);
  });

  test('in building a network is told with the part of the study', async () => {
    const told = await inPage(SMALL.replace('{share: 0.5}', '{target: e_i_group, value: 1}'), {}, 1);
    expect(told.problems[0]?.place).toMatch(/^arms\[1\]/);
  });

  test('in wealth that leaves the range of numbers is told with arm and generation', async () => {
    const told = await inPage(SMALL.replace('gross_return: 2.5', 'gross_return: 1e120'), {}, 1);
    expect(told.failed).toMatch(/^arm 'segregated' generation \d+: household \d+/);
  });

  test('a missing file is told at its place', async () => {
    const told = await inPage(OBSERVED, { 'ties.csv': TIES }, 1);
    expect(told.problems).toMatchObject([{ code: 'no-such-file', place: 'study:5:31' }]);
  });

  test('a study too large for a page is refused before it starts', async () => {
    const told = await inPage(
      SMALL.replace('households: 120', 'households: 2000000').replace('replicates: 4', 'replicates: 100'),
      {},
      1,
    );
    expect(told.problems).toMatchObject([{ code: 'too-large', place: expect.stringMatching(/^study:\d+:\d+$/) }]);
  });
});
