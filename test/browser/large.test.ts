/**
 * A panel of a million rows opens in a few seconds, by reading only what is shown, and memory stays bounded.
 */
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import type { Browser } from 'playwright-core';
import { afterAll, beforeAll, expect, test } from 'vitest';
import type { RunningViewer } from '../../sim/command/view.js';
import { bundle } from '../../sim/results/bundle.js';
import type { Facts } from '../../sim/results/facts.js';
import { PartWriter } from '../../sim/results/parts.js';
import { memoryStore } from '../../sim/results/store.js';
import { loadInputs } from '../../sim/study/inputs.js';
import { parseStudy, studyText } from '../../sim/study/parse.js';
import { simulate } from '../../sim/study/replicate.js';
import { VERSION } from '../../sim/version.js';
import { launch } from './chromium.js';
import { HAMLETS } from './results.js';
import { servedSite } from './site.js';

const N = 50_000;
const GENERATIONS = 10;
const YAML = HAMLETS.replace('Twenty hamlets', 'A large county')
  .replace('households: 600', `households: ${N}`)
  .replace('count: 20', 'count: 600')
  .replace('generations: 6', `generations: ${GENERATIONS}`)
  .replace('replicates: 3', 'replicates: 1');

let dir: string;
let served: RunningViewer;
let browser: Browser;
let panelBytes = 0;

beforeAll(async () => {
  const parsed = parseStudy(YAML, 'study.yaml');
  const prepared = { study: parsed.study, inputs: await loadInputs(parsed, async () => null) };
  const { study } = prepared;
  // the panel as the engine leaves it, without the measures, which take their time
  const facts: Facts = {
    milestones: 1,
    currency: study.currency,
    extras: [],
    covariates: [],
    placeNames: false,
    betweenness: false,
    indicators: [],
    evidence: [],
  };
  const store = memoryStore();
  const writer = new PartWriter({ store, facts, formats: ['parquet'], keep: 'all', replicate: 0 });
  simulate(prepared, 0, {
    armStarts: (record) => writer.armStarts(record),
    generation: (record) => writer.generation(record),
    armEnds: () => writer.armEnds(),
  });
  writer.commit();
  const files = await bundle(store, {
    head: {
      version: VERSION,
      study: study.study,
      studyHash: '0'.repeat(64),
      seed: study.seed,
      arms: study.arms.map((arm) => arm.name),
      replicates: 1,
      generations: GENERATIONS,
      households: N,
      started: '2026-01-01T00:00:00.000Z',
    },
    studyYaml: studyText(study),
    facts,
    formats: ['parquet'],
    tables: [],
    end: { seconds: 1, peakMemory: 0 },
  });
  dir = mkdtempSync(join(tmpdir(), 'rungsight-large-'));
  for (const [name, bytes] of files) {
    mkdirSync(dirname(join(dir, name)), { recursive: true });
    writeFileSync(join(dir, name), bytes);
  }
  panelBytes = files.get('panel.parquet')?.length ?? 0;
  [browser, served] = await Promise.all([launch(), servedSite({ dir })]);
});
afterAll(async () => {
  await browser?.close();
  await served?.close();
  rmSync(dir, { recursive: true, force: true });
});

test('opens by reading the row groups it shows', async () => {
  const context = await browser.newContext({ viewport: { width: 1280, height: 800 } });
  await context.addInitScript(() => {
    localStorage.setItem('rungsight guide', 'seen');
    localStorage.setItem('rungsight caution A large county', 'shown');
  });
  const page = await context.newPage();
  const problems: string[] = [];
  page.on('pageerror', (e) => problems.push(String(e)));
  let panel = 0;
  let requests = 0;
  page.on('response', (answer) => {
    if (!answer.url().endsWith('panel.parquet') || answer.status() !== 206) return;
    requests++;
    panel += Number(answer.headers()['content-length']);
  });
  const began = performance.now();
  await page.goto(`${served.url}#generation=3`);
  await page.waitForFunction(() => window.rungsight?.scene?.generation === 3, null, { polling: 50 });
  const seconds = (performance.now() - began) / 1000;
  const opened = panel;
  // one generation of two arms (and the first and the one before, for places and halos): under a third of the file
  expect(opened).toBeGreaterThan(0);
  expect(opened).toBeLessThan(panelBytes / 3);
  // the aim is 3 seconds with a machine to itself; here others may be at work on it
  console.log(
    `a million rows opened in ${seconds.toFixed(1)} s, ${(opened / 1e6).toFixed(0)} of ${(panelBytes / 1e6).toFixed(0)} MB in ${requests} requests`,
  );
  expect(seconds).toBeLessThan(12);
  // through all generations: what is kept has a bound
  for (let t = 0; t < GENERATIONS; t++) {
    await page.evaluate((generation) => window.rungsight.change({ generation }), t);
  }
  const held = await page.evaluate(() => window.rungsight.loader.held);
  expect(held).toBeLessThan(330e6);
  const first = panel;
  await page.evaluate(() => window.rungsight.change({ generation: 9 }));
  expect(panel, 'what is kept is not read again').toBe(first);
  expect(problems).toEqual([]);
  await context.close();
});
