import { mkdtempSync, readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeAll, describe, expect, test, vi } from 'vitest';
import { InputError } from '../../../network/errors.js';
import { type Added, addEstimatesAndReport, checkStudyEstimates } from '../../../sim/command/estimate-after.js';
import { IndicatorCube } from '../../../sim/results/cube.js';
import { finishTables } from '../../../sim/results/finish.js';
import { startRun, studyHash } from '../../../sim/results/folder.js';
import { openResults } from '../../../sim/results/open.js';
import { PanelReader } from '../../../sim/results/read.js';
import { reportHtml } from '../../../sim/results/report/report.js';
import { canonicalText, factsOf, runReplicate } from '../../../sim/results/run-replicate.js';
import { loadInputs } from '../../../sim/study/inputs.js';
import { parseStudy, studyText } from '../../../sim/study/parse.js';

// the package carries no types, and as a test environment it would replace the typed arrays that files are made of
const { JSDOM } = createRequire(import.meta.url)('jsdom') as {
  JSDOM: new (html: string) => { window: { document: Document } };
};

interface Change {
  readonly title?: string;
  readonly replicates?: number;
  readonly generations?: number;
  readonly keep?: string;
  readonly arms?: string;
  readonly estimates?: string;
}

const TWO_ARMS = `
  - name: kept apart
    network: {kind: blocks, mean_degree: 6, within_place: 0.9}
  - name: mixed
    network: {from: kept apart, mixing: {share: 1}}`;

const ESTIMATES = `
estimates:
  - name: Gap and growth
    outcome: growth
    covariates: [log_wealth, aspiration_gap, {square: aspiration_gap}]
    effects: [generation]
    cluster: [place]
  - name: Mixed arm
    outcome: frustrated
    covariates: [{dummy: arm}]
    truth: {arm=mixed: 0}
`;

function studyYaml(change: Change): string {
  return `study: ${JSON.stringify(change.title ?? 'Two valleys')}
seed: report-1
replicates: ${change.replicates ?? 3}
generations: ${change.generations ?? 5}
currency: thousand crowns
population:
  households: 160
  places: 4
  groups: [{name: upper, share: 0.5}, {name: lower, share: 0.5, relative_wealth: 0.6}]
  wealth: {shape: lognormal, mean: 40, sd_log: 0.6, between_places: 0.4}
technology: {kind: concave, scale: 8, elasticity: 0.6}
shock: {sd_log: 0.2}
preferences: {curvature: 0.6, child_weight: 0.5}
reference:
  milestones:
    - weight: 1
      mix: [{from: neighbours, statistic: upward_mean, weight: 0.9}, {from: self, weight: 0.1}]
arms:${change.arms ?? TWO_ARMS}
pockets: {permutations: 19}
keep: ${change.keep ?? '{panel: all}'}
${change.estimates ?? ''}`;
}

/** Runs a study to a folder as the command line does. */
async function folderOf(change: Change = {}): Promise<{ dir: string; added: Added }> {
  const parsed = parseStudy(studyYaml(change), 'study.yaml');
  const { study } = parsed;
  const prepared = { study, inputs: await loadInputs(parsed, async () => null) };
  const facts = factsOf(prepared);
  const folder = startRun(join(mkdtempSync(join(tmpdir(), 'rungsight-')), 'out'), {
    head: {
      version: '0.0.1',
      study: study.study,
      studyHash: studyHash(canonicalText(prepared)),
      seed: study.seed,
      arms: study.arms.map((arm) => arm.name),
      replicates: study.replicates,
      generations: study.generations,
      households: 160,
      started: '2000-01-01T00:00:00.000Z',
    },
    studyYaml: studyText(study),
  });
  for (let r = 0; r < study.replicates; r++) runReplicate(prepared, facts, folder.store, r, () => {});
  await folder.assemble(facts, study.keep.formats);
  const { tables, notes } = finishTables(folder.store, facts, study);
  for (const { name, rows } of tables) folder.writeTable(facts, name, rows);
  folder.writeCodebook(facts);
  const added = await addEstimatesAndReport(folder, study, parsed.place, notes);
  await folder.finish({ seconds: 1, peakMemory: 1, notes });
  return { dir: folder.out, added };
}

function pageOf(html: string): Document {
  return new JSDOM(html).window.document;
}

/** Text with spaces as people type them. */
function textOf(element: { textContent: string | null }): string {
  return (element.textContent ?? '').replaceAll('\u00a0', ' ');
}

afterEach(() => {
  vi.restoreAllMocks();
});

describe('the report of a study of two arms', () => {
  let dir: string;
  let html: string;
  let page: Document;
  let added: Added;

  beforeAll(async () => {
    ({ dir, added } = await folderOf({ estimates: ESTIMATES }));
    html = readFileSync(join(dir, 'report.html'), 'utf8');
    page = pageOf(html);
  });

  test('is one page that asks for nothing: no script, no address, nothing to load', () => {
    expect(page.querySelectorAll('script, link, img, iframe, object, [src]')).toHaveLength(0);
    const outside = [...page.querySelectorAll('[href]')].map((at) => at.getAttribute('href') ?? '');
    expect(outside.length).toBeGreaterThan(5);
    expect(outside.filter((href) => !href.startsWith('#'))).toEqual([]);
    expect(html).not.toMatch(/url\(|@import|javascript:|\son\w+=/);
    expect(html.replaceAll('http://www.w3.org/2000/svg', '')).not.toMatch(/https?:/);
  });

  test('the question and its answer stand before anything else', () => {
    const head = textOf(page.querySelector('header') as Element);
    expect(head).toContain('Two valleys');
    expect(head).toContain('Are the same households more or less often frustrated in ‘mixed’ than in ‘kept apart’?');
    expect(head).toMatch(/‘mixed’ (raised|lowered|made no difference to) frustration/);
    expect(head).toContain('predicts no family’s future');
    expect(html.indexOf('class="answer"')).toBeLessThan(html.indexOf('<h2'));
  });

  test('every figure has a name and a description, every link leads somewhere, no number is missing', () => {
    const figures = [...page.querySelectorAll('svg.figure')];
    // frustration and its contrast and clusters, densities, Gini and its contrast, incidence, transitions, networks
    expect(figures.length).toBeGreaterThanOrEqual(17);
    for (const figure of figures) {
      expect(figure.getAttribute('role')).toBe('img');
      expect(textOf(figure.querySelector('title') as Element)).not.toBe('');
      expect(textOf(figure.querySelector('desc') as Element)).not.toBe('');
    }
    for (const link of page.querySelectorAll('[href^="#"]'))
      expect(page.getElementById((link.getAttribute('href') ?? '').slice(1))).not.toBeNull();
    expect(new Set([...page.querySelectorAll('[id]')].map((at) => at.id)).size).toBe(
      page.querySelectorAll('[id]').length,
    );
    expect(html).not.toMatch(/NaN|undefined|Infinity|null/);
  });

  test('figures and tables say what the tables of the folder say', async () => {
    const results = await openResults(dir);
    const indicators = await results.table('indicators');
    if (indicators === null) throw new Error('no indicators');
    const cube = IndicatorCube.of(indicators);
    const desc = [...page.querySelectorAll('svg.figure')]
      .find((figure) => figure.querySelector('title')?.textContent?.startsWith('Share of households frustrated'))
      ?.querySelector('desc')?.textContent;
    const words = (arm: number): string =>
      Array.from({ length: 5 }, (_, t) => {
        const share = 100 * cube.mean('share_frustrated', arm, t);
        return `${share.toFixed(share < 9.95 && share > 0 ? 1 : 0)} %`;
      }).join(', ');
    expect(desc).toBe(`kept apart: ${words(0)}. mixed: ${words(1)}`);
    const gini = [...page.querySelectorAll('tbody tr')].find(
      (row) => row.querySelector('th')?.textContent === 'Gini' && row.querySelectorAll('td').length === 8,
    );
    // the start of each arm stands in the first of four columns
    expect(gini?.querySelectorAll('td')[0].textContent).toBe(cube.mean('gini', 0, 0).toFixed(3));
    expect(gini?.querySelectorAll('td')[4].textContent).toBe(cube.mean('gini', 1, 0).toFixed(3));
  });

  test('a drawing states the share of ties that stay in the place, counted from the tables', async () => {
    const results = await openResults(dir);
    const said = [...page.querySelectorAll('.field')].map((field) => ({
      arm: textOf(field.querySelector('h3') as Element),
      note: textOf(field.querySelector('.note') as Element),
      marks: field.querySelectorAll('svg .n-disc').length,
    }));
    expect(said.map(({ arm }) => arm)).toEqual(['kept apart', 'mixed']);
    const replicate = Number(/Drawn for replicate (\d+)/.exec(textOf(page.body))?.[1]);
    for (const { arm, note, marks } of said) {
      expect(marks).toBe(3);
      const query = { arms: [arm], replicates: [replicate] };
      const ties = await (await results.pieces('ties'))?.read(query);
      const households = await (await results.pieces('households'))?.read(query);
      if (ties === undefined || households === undefined) throw new Error('tables are missing');
      const place = households.columns.place as Int32Array;
      const [source, target] = [ties.columns.source as Int32Array, ties.columns.target as Int32Array];
      expect(place).toHaveLength(160);
      let same = 0;
      for (let e = 0; e < ties.rows; e++) same += place[source[e]] === place[target[e]] ? 1 : 0;
      const found = Number(/of the same place: [\d.]+ % of drawn neighbours, ([\d.]+) % of ties/.exec(note)?.[1]);
      // the report rounds to a whole per cent, or a tenth of one below ten
      expect(Math.abs(found - (100 * same) / ties.rows)).toBeLessThanOrEqual(found < 10 ? 0.051 : 0.5);
    }
  });

  test('the model is told under the seven headings of the protocol with the study’s own numbers', () => {
    const headings = [...page.querySelectorAll('#model ~ h3')].map(textOf);
    expect(headings).toEqual([
      '1. Purpose and patterns',
      '2. Entities, state variables and scales',
      '3. Process overview and scheduling',
      '4. Design concepts',
      '5. Initialization',
      '6. Input data',
      '7. Submodels',
    ]);
    const model = textOf((page.getElementById('model') as Element).parentElement as Element);
    for (const said of [
      '160 of them in 4 places and 2 groups (upper and lower)',
      'lower (50 % of households, wealth multiplied by 0.6)',
      'A = 8, α = 0.6',
      'σ = 0.6',
      'child weight δ = 0.5',
      '0.9 × the mean wealth of those richer than itself among those it has ties to',
      'log has standard deviation 0.2',
      '‘mixed’: the ties of ‘kept apart’ with 100 % of them swapped at random',
      '19 random reshufflings',
    ]) {
      expect(model).toContain(said);
    }
  });

  test('regressions of the study stand in it, in words, with the truth where it is known', () => {
    expect(added.problems).toEqual([]);
    expect(added.estimates?.summary.map(({ name }) => name)).toEqual(['Gap and growth', 'Gap and growth', 'Mixed arm']);
    const names = [...page.querySelectorAll('.estimate h3')].map(textOf);
    expect(names).toEqual(['Gap and growth', 'Mixed arm']);
    for (const table of page.querySelectorAll('table')) {
      const widths = [...table.querySelectorAll('tr')].map((row) =>
        [...row.querySelectorAll('th, td')].reduce((sum, at) => sum + Number(at.getAttribute('colspan') ?? 1), 0),
      );
      expect(new Set(widths).size, textOf(table.querySelector('caption') as Element)).toBe(1);
    }
    const terms = [...(page.querySelector('.estimate') as Element).querySelectorAll('tbody th')].map(textOf);
    expect(terms).toEqual(['log wealth', 'aspiration gap', 'aspiration gap, squared'].flatMap((term) => [term, term]));
    expect(textOf(page.querySelectorAll('.estimate')[1])).toContain('The truth of arm: mixed is 0');
  });

  test('written again from the whole folder it is the same to the byte, and in the manifest', async () => {
    const results = await openResults(dir);
    expect(await reportHtml(results)).toBe(html);
    expect(results.manifest.files.map(({ name }) => name)).toEqual(
      expect.arrayContaining(['report.html', 'estimates.csv', 'estimates.json', 'panel.R', 'panel.py']),
    );
  });

  test('of the panel and the ties it reads one replicate', async () => {
    const read = vi.spyOn(PanelReader.prototype, 'read');
    await reportHtml(await openResults(dir));
    // households, ties and three generations of each arm
    expect(read).toHaveBeenCalledTimes(2 * 5);
    const replicates = read.mock.calls.map(([query]) => query?.replicates);
    expect(new Set(replicates.flat()).size).toBe(1);
    expect(replicates.every((list) => list?.length === 1)).toBe(true);
  });
});

describe('other studies', () => {
  test('one arm and one replicate: no contrast, no interval, no claim of either', async () => {
    const arms = '\n  - name: alone\n    network: {kind: random, mean_degree: 5}';
    const { dir } = await folderOf({ arms, replicates: 1 });
    const page = pageOf(readFileSync(join(dir, 'report.html'), 'utf8'));
    const text = textOf(page.body);
    expect(text).toContain('How many households are frustrated in ‘alone’');
    expect(text).not.toMatch(/NaN|undefined|‘alone’ minus/);
    expect(text).toContain('One replicate.');
    expect([...page.querySelectorAll('svg title')].map(textOf)).toContain('Wealth in generations 0 and 4');
  });

  test('three arms, no panel, two generations: the tables are told, households are not drawn', async () => {
    const arms = `${TWO_ARMS}\n  - name: half\n    network: {from: kept apart, mixing: {share: 0.5}}`;
    const { dir } = await folderOf({ arms, keep: '{panel: none}', replicates: 2, generations: 2 });
    const page = pageOf(readFileSync(join(dir, 'report.html'), 'utf8'));
    const text = textOf(page.body);
    expect(text).toContain('‘half’ minus ‘kept apart’');
    expect(text).not.toMatch(/NaN|undefined|Drawn for replicate/);
    expect(page.querySelectorAll('.field')).toHaveLength(0);
  });

  test('a thinned panel in CSV: the generations kept are drawn, a household’s mark stands where it is', async () => {
    const { dir } = await folderOf({ keep: '{panel: {replicates: 1, every: 2, households: 50}, formats: [csv]}' });
    const page = pageOf(readFileSync(join(dir, 'report.html'), 'utf8'));
    const drawn = [...page.querySelectorAll('.field')].map((field) =>
      [...field.querySelectorAll('figcaption')].map((at) => /Generation (\d+)/.exec(textOf(at))?.[1]),
    );
    for (const generations of drawn) for (const t of generations) expect(['0', '2', '4']).toContain(t);
    const first = page.querySelector('.field svg') as Element;
    const marks = [...first.querySelectorAll('.n-disc, .n-ring')].map((at) => at.getAttribute('d') ?? '').join('');
    expect(marks.match(/M/g)).toHaveLength(50);
  });

  test('names from the study cannot become markup', async () => {
    const arms = '\n  - name: "<i>a&b\\"</i>"\n    network: {kind: random, mean_degree: 5}';
    const { dir } = await folderOf({ title: '<b onload="x">T</b> & co', arms, replicates: 1, generations: 2 });
    const page = pageOf(readFileSync(join(dir, 'report.html'), 'utf8'));
    expect(page.querySelectorAll('b, i, [onload]')).toHaveLength(0);
    expect(textOf(page.querySelector('h1') as Element)).toBe('<b onload="x">T</b> & co');
    expect(page.title).toBe('<b onload="x">T</b> & co: report');
  });
});

describe('estimates of a study', () => {
  const checked = async (estimates: string): Promise<string> => {
    const parsed = parseStudy(studyYaml({ estimates }), 'study.yaml');
    const prepared = { study: parsed.study, inputs: await loadInputs(parsed, async () => null) };
    try {
      await checkStudyEstimates(prepared, parsed.place);
    } catch (error) {
      if (error instanceof InputError) return error.message;
      throw error;
    }
    return '';
  };

  test('are checked against the columns before the run, at their line', async () => {
    expect(await checked(ESTIMATES)).toBe('');
    expect(await checked(ESTIMATES.replace('aspiration_gap,', 'aspiration_gab,'))).toMatch(
      /^study\.yaml:\d+:\d+: Gap and growth: there is no column 'aspiration_gab'; did you mean 'aspiration_gap'\?$/,
    );
    expect(await checked(ESTIMATES.replace('cluster: [place]', 'where: {arm: [mixt]}'))).toMatch(/no arm "mixt"/);
    expect(await checked(ESTIMATES.replace('{dummy: arm}', 'clustering'))).toBe('');
  });

  test('that cannot be had do not lose the run: they are told, and the report is written without them', async () => {
    const { dir, added } = await folderOf({
      replicates: 1,
      generations: 2,
      estimates: 'estimates: [{name: Nobody, outcome: growth, covariates: [log_wealth], where: {wealth: {to: 0}}}]',
    });
    expect(added.estimates).toBeNull();
    expect(added.problems[0].problem).not.toBe('');
    const html = readFileSync(join(dir, 'report.html'), 'utf8');
    expect(html).not.toContain('id="estimates"');
  });

  test('need a panel', () => {
    expect(() => parseStudy(studyYaml({ estimates: ESTIMATES, keep: '{panel: none}' }), 's.yaml')).toThrow(
      /estimates need a panel and keep.panel is none/,
    );
  });
});
