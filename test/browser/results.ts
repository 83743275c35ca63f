/**
 * A small study run to a results folder in the temporary folder, by the same code as `run`, without its worker pool.
 */
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { bundle } from '../../sim/results/bundle.js';
import { finishTables } from '../../sim/results/finish.js';
import { factsOf, householdsOf, runReplicate } from '../../sim/results/run-replicate.js';
import { memoryStore } from '../../sim/results/store.js';
import { loadInputs } from '../../sim/study/inputs.js';
import { parseStudy, studyText } from '../../sim/study/parse.js';
import { VERSION } from '../../sim/version.js';

/** Twenty hamlets that keep apart, in a setting of our own; frustration comes in clusters. */
export const HAMLETS = `study: Twenty hamlets
seed: hamlets-1
replicates: 3
generations: 6
currency: sacks of grain

population:
  households: 600
  places: {count: 20, size_cv: 0.1}
  groups:
    - {name: shore, share: 0.65}
    - {name: hill, share: 0.35, relative_wealth: 0.45}
  wealth: {shape: lognormal, mean: 50, sd_log: 0.6727, between_places: 0.5525}

technology: {kind: concave, scale: 8, elasticity: 0.6}
shock: {sd_log: 0.2}
preferences: {curvature: 0.6, child_weight: 0.5}
reference:
  milestones:
    - weight: 1
      mix:
        - {from: neighbours, statistic: upward_mean, weight: 0.8}
        - {from: self, weight: 0.1}
        - {from: society, statistic: mean, weight: 0.1}

arms:
  - name: apart
    network: {kind: blocks, mean_degree: 8, within_place: 0.97}
  - name: mixed
    network: {from: apart, mixing: {share: 1}}
`;

/** Two groups in one place that hardly meet, and the same households mixed. */
export const SEPARATED = HAMLETS.replace('Twenty hamlets', 'Two peoples')
  .replace('replicates: 3', 'replicates: 1')
  .replace('generations: 6', 'generations: 2')
  .replace('  places: {count: 20, size_cv: 0.1}\n', '')
  .replace(', between_places: 0.5525', '')
  .replace('within_place: 0.97', 'within_group: 0.92');

export interface MadeResults {
  readonly dir: string;
  readonly files: ReadonlyMap<string, Uint8Array>;
  remove(): void;
}

/** Runs a study without data files and writes its folder. */
export async function madeResults(yaml: string): Promise<MadeResults> {
  const parsed = parseStudy(yaml, 'study.yaml');
  const prepared = { study: parsed.study, inputs: await loadInputs(parsed, async () => null) };
  const { study } = prepared;
  const facts = factsOf(prepared);
  const store = memoryStore();
  for (let r = 0; r < study.replicates; r++) runReplicate(prepared, facts, store, r, () => {});
  const { tables, notes } = finishTables(store, facts, study);
  const files = await bundle(store, {
    head: {
      version: VERSION,
      study: study.study,
      studyHash: '0'.repeat(64),
      seed: study.seed,
      arms: study.arms.map((arm) => arm.name),
      replicates: study.replicates,
      generations: study.generations,
      households: householdsOf(prepared),
      started: '2026-01-01T00:00:00.000Z',
    },
    studyYaml: studyText(study),
    facts,
    formats: study.keep.formats,
    tables,
    end: { seconds: 1, peakMemory: 0, notes },
  });
  const dir = mkdtempSync(join(tmpdir(), 'rungsight-results-'));
  for (const [name, bytes] of files) {
    mkdirSync(dirname(join(dir, name)), { recursive: true });
    writeFileSync(join(dir, name), bytes);
  }
  return { dir, files: new Map(files), remove: () => rmSync(dir, { recursive: true, force: true }) };
}
