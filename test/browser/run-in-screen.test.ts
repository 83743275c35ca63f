/**
 * The whole way in the screen: a study opens and runs, is changed in the sheet and run again, is refused where it is
 * wrong, and is saved as the command line would have written it.
 */
import { execFileSync } from 'node:child_process';
import { mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { unzipSync } from 'fflate';
import type { Browser, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, beforeEach, expect, test } from 'vitest';
import { parse } from 'yaml';
import type { RunningViewer } from '../../sim/command/view.js';
import { SAMPLE } from '../viewer/sheet/sample.js';
import { launch } from './chromium.js';
import { servedSite } from './site.js';

const COMMAND = fileURLToPath(new URL('../../dist/sim/command/main.js', import.meta.url));
const STUDY = `${SAMPLE.replace('households: 300', 'households: 120').replace(', within_group: 0.8', '')}pockets: {permutations: 19}\n`;

let folder: string;
let browser: Browser;
let served: RunningViewer;
let page: Page;
let complaints: string[] = [];

beforeAll(async () => {
  folder = mkdtempSync(join(tmpdir(), 'rungsight-screen-'));
  writeFileSync(join(folder, 'valleys.yaml'), STUDY);
  [browser, served] = await Promise.all([launch(), servedSite({ study: join(folder, 'valleys.yaml') })]);
});
afterAll(async () => {
  await browser?.close();
  await served?.close();
  rmSync(folder, { recursive: true, force: true });
});
beforeEach(async () => {
  complaints = [];
  const context = await browser.newContext({ viewport: { width: 1280, height: 800 }, acceptDownloads: true });
  await context.addInitScript(() => {
    if (location.protocol !== 'http:') return;
    localStorage.setItem('rungsight guide', 'seen');
    localStorage.setItem('rungsight caution Two valleys', 'shown');
  });
  page = await context.newPage();
  page.on('console', (message) => {
    if (['error', 'warning'].includes(message.type())) complaints.push(message.text());
  });
  page.on('pageerror', (error) => complaints.push(String(error)));
  await page.goto(served.url);
  await page.waitForSelector('.screen');
});
afterEach(async () => {
  await page.context().close();
  expect(complaints).toEqual([]);
});

const run = () => page.locator('.actions').getByRole('button', { name: 'Run', exact: true });
const sheet = () => page.locator('dialog.sheet');
const words = (selector: string): Promise<string> =>
  page
    .locator(selector)
    .first()
    .evaluate((element) => (element.textContent ?? '').replace(/\s+/g, ' ').trim());

/** Until no run is under way. */
async function whole(): Promise<void> {
  await run().waitFor({ timeout: 90_000 });
}

async function saved(name: string): Promise<{ name: string; bytes: Uint8Array }> {
  await page.locator('.actions').getByRole('button', { name: 'Save…' }).click();
  const [download] = await Promise.all([
    page.waitForEvent('download'),
    page.locator('.offer', { hasText: name }).click(),
  ]);
  const path = join(folder, 'saved');
  await download.saveAs(path);
  await page.waitForFunction(() => document.querySelector('dialog') === null);
  return { name: download.suggestedFilename(), bytes: new Uint8Array(readFileSync(path)) };
}

test('a study opened runs by itself; its folder, saved, is the one the command line writes', async () => {
  await whole();
  expect(await words('.title')).toContain('of 4');
  const out = join(folder, 'out');
  execFileSync(process.execPath, [COMMAND, 'run', join(folder, 'valleys.yaml'), '--out', out, '--json'], {
    stdio: 'pipe',
  });
  const zip = unzipSync((await saved('Results folder')).bytes);
  const folderSaved = new Map(Object.entries(zip).map(([name, bytes]) => [name.split('/').slice(1).join('/'), bytes]));
  for (const entry of readdirSync(out)) {
    // the manifest tells of the machine and the moment
    if (entry === 'manifest.json') continue;
    expect(Buffer.from(folderSaved.get(entry) ?? []).equals(readFileSync(join(out, entry))), entry).toBe(true);
  }
  const study = await saved('Study (YAML)');
  expect(study.name).toBe('two-valleys.yaml');
  expect(new TextDecoder().decode(study.bytes)).toBe(readFileSync(join(out, 'study.yaml'), 'utf8'));
});

test('a study saved from the sheet, opened again, is the same text', async () => {
  await whole();
  await page.getByRole('button', { name: 'Study…' }).click();
  await page.locator('#set-generations').fill('3');
  const [download] = await Promise.all([
    page.waitForEvent('download'),
    sheet().getByRole('button', { name: 'Save study' }).click(),
  ]);
  expect(download.suggestedFilename()).toBe('two-valleys.yaml');
  const path = join(folder, 'again.yaml');
  await download.saveAs(path);
  expect(readFileSync(path, 'utf8')).toBe(STUDY.replace('generations: 6', 'generations: 3'));
  await page.locator('#set-generations').fill('5');
  await page.locator('.file-input').setInputFiles(path);
  await expect.poll(() => page.locator('#set-generations').inputValue()).toBe('3');
  await sheet().getByRole('button', { name: 'Run', exact: true }).click();
  await whole();
  // three decisions, and the last children
  await expect.poll(() => page.locator('.strip-names span').count()).toBe(4);
});

test('a study that is wrong only when it runs comes back to the sheet, at its line', async () => {
  await whole();
  await page.getByRole('button', { name: 'Study…' }).click();
  await page.locator('#set-arms-1-network-mixing').selectOption('target');
  await page.locator('#set-arms-1-network-mixing-target').selectOption('e_i_group');
  await page.locator('#set-arms-1-network-mixing-value').fill('1');
  await sheet().getByRole('button', { name: 'Run', exact: true }).click();
  await sheet().waitFor();
  await expect.poll(() => words('#sheet-state')).toContain('1 problem');
  expect(await words('.fault-list')).toMatch(/^line \d+/);
  // what was edited is still there
  expect(await page.locator('#set-arms-1-network-mixing-value').inputValue()).toBe('1');
  await sheet().getByRole('button', { name: 'Close' }).click();
  // and the study shown before still is
  expect(await words('.summary')).toContain('Generation');
});

test('a run can be stopped, and what was shown stays', async () => {
  await whole();
  await page.getByRole('button', { name: 'Study…' }).click();
  await page.locator('#set-population-households').fill('4000');
  await page.locator('#set-replicates').fill('20');
  await sheet().getByRole('button', { name: 'Run', exact: true }).click();
  await page.getByRole('button', { name: 'Cancel' }).click();
  await run().waitFor();
  expect(await words('.message')).toContain('stopped');
  expect(await words('.title')).toContain('of 4');
});

test('households and ties dropped on the sheet run, and the study then says so', async () => {
  await whole();
  await page.getByRole('button', { name: 'Study…' }).click();
  const people = ['household,wealth,place,group'].concat(
    Array.from(
      { length: 60 },
      (_, i) => `h${i},${10 + ((i * 37) % 90)},p${i % 3},${i % 4 === 0 ? 'upland' : 'lowland'}`,
    ),
  );
  const ties = ['source,target'].concat(Array.from({ length: 60 }, (_, i) => `h${i},h${(i + 3) % 60}`));
  await page.locator('.file-input').setInputFiles([
    { name: 'people.csv', mimeType: 'text/csv', buffer: Buffer.from(people.join('\n')) },
    { name: 'ties.csv', mimeType: 'text/csv', buffer: Buffer.from(ties.join('\n')) },
  ]);
  await page.getByRole('button', { name: 'use as the households' }).click();
  await page.getByRole('button', { name: 'use as the ties of segregated' }).click();
  await sheet().getByRole('button', { name: 'Run', exact: true }).click();
  await whole();
  const study = parse(new TextDecoder().decode((await saved('Study (YAML)')).bytes)) as {
    population: { households_file: string };
  };
  expect(study.population.households_file).toMatch(/people\.csv$/);
  const ties2 = await saved('Ties');
  expect(ties2.name).toBe('two-valleys-ties.parquet');
});
