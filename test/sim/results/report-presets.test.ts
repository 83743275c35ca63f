import { readdirSync, readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { describe, expect, test } from 'vitest';
import { checkStudyEstimates } from '../../../sim/command/estimate-after.js';
import { readStudy } from '../../../sim/command/study-files.js';
import { panelSource } from '../../../sim/estimate/panel.js';
import { runEstimates } from '../../../sim/estimate/run.js';
import { bundle, memorySource } from '../../../sim/results/bundle.js';
import { openSource } from '../../../sim/results/read.js';
import { factsOf, runReplicate } from '../../../sim/results/run-replicate.js';
import { memoryStore } from '../../../sim/results/store.js';
import { loadInputs } from '../../../sim/study/inputs.js';
import { parseStudy, studyText } from '../../../sim/study/parse.js';

const FOLDER = fileURLToPath(new URL('../../../presets/', import.meta.url));
const STUDIES = readdirSync(FOLDER).filter((file) => file.endsWith('.yaml'));

describe('the built-in studies', () => {
  test.each(STUDIES)('%s asks for regressions its panel can answer', async (name) => {
    const { prepared, parsed } = await readStudy(FOLDER + name);
    await expect(checkStudyEstimates(prepared, parsed.place)).resolves.toBeUndefined();
  });

  test('peers-or-luck: friends’ growth does nothing; least squares says it does, instruments and village effects do not', async () => {
    const file = `${FOLDER}peers-or-luck.yaml`;
    const replicates = 6;
    const text = readFileSync(file, 'utf8')
      .replace(/^replicates: .*/m, `replicates: ${replicates}\npockets: {permutations: 0}`)
      .replace(/^generations: .*/m, 'generations: 3');
    const parsed = parseStudy(text, file);
    const { study, place } = parsed;
    const prepared = { study, inputs: await loadInputs(parsed, async () => null) };
    const facts = factsOf(prepared);
    const store = memoryStore();
    for (let r = 0; r < replicates; r++) runReplicate(prepared, facts, store, r, () => {});
    const files = await bundle(store, {
      head: {
        version: '0.0.1',
        study: study.study,
        studyHash: '',
        seed: study.seed,
        arms: study.arms.map((arm) => arm.name),
        replicates,
        generations: study.generations,
        households: 2400,
        started: '',
      },
      studyYaml: studyText(study),
      facts,
      formats: ['parquet'],
      tables: [],
      end: { seconds: 0, peakMemory: 0 },
    });
    const source = await panelSource(await openSource(memorySource(files)), 'memory');
    const { summary } = await runEstimates(study.estimates ?? [], source, place);
    const peers = summary.map((one) => one.terms.find(({ term }) => term === 'neighbour_mean_growth'));
    expect(peers.map((term) => term?.truth)).toEqual([0, 0, 0]);
    const [naive, within, instrumented] = peers;
    // half the luck is shared in a village: least squares takes it for influence in every replicate
    expect(naive?.mean).toBeGreaterThan(0.2);
    expect(naive?.rejects_zero).toBe(1);
    for (const honest of [within, instrumented]) {
      // t with 5 degrees of freedom leaves 4.03 standard errors in 1 of 100 seeds, and the seed is fixed
      expect(Math.abs(honest?.mean ?? NaN)).toBeLessThan(4.03 * (honest?.mc_se ?? NaN));
      expect(honest?.coverage).toBeGreaterThan(0.6);
    }
    expect(summary[2].median_F).toBeGreaterThan(10);
  });
});
