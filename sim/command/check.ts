/**
 * `check`: reads everything a study names, writes nothing, and says what the run would need.
 *
 * Time and disk come from a short trial in memory: a few generations of one replicate, of a smaller population where the
 * study's is large. Memory is counted from the columns a run holds.
 */
import { availableParallelism } from 'node:os';
import type { Command } from 'commander';
import { InputError } from '../../network/errors.js';
import { factsOf, householdsOf, runReplicate } from '../results/run-replicate.js';
import { memoryStore } from '../results/store.js';
import type { Study } from '../study/complete.js';
import type { Prepared } from '../study/replicate.js';
import { amount, counted, duration, size } from './progress.js';
import { placed, readStudy } from './study-files.js';

/** What a run is expected to need. */
export interface Needs {
  readonly households: number;
  /** Arms × replicates × generations × households. */
  readonly household_generations: number;
  /** All workers together. */
  readonly memory_bytes: number;
  readonly disk_bytes: number;
  readonly seconds: number;
  readonly threads: number;
}

export function checkCommand(program: Command): void {
  program
    .command('check')
    .argument('<study>', 'a study file, or the name of a built-in study')
    .option('--json', 'machine-readable result on standard output')
    .summary('read a study without running it: errors, and what the run would need')
    .description('Reads a study and every file it names, and estimates memory, disk and time from a short trial.')
    .addHelpText('after', '\nExample:\n  rungsight check my-study.yaml')
    .action(async (given: string, options: { json?: true }) => {
      const disk = await readStudy(given);
      let needs: Needs;
      try {
        needs = estimateNeeds(disk.prepared);
      } catch (error) {
        if (error instanceof InputError) throw new InputError(placed(error.problems, disk.parsed));
        throw error;
      }
      if (options.json) console.log(JSON.stringify({ ok: true, ...needs }, null, 2));
      else console.log(text(disk.prepared.study, needs));
    });
}

/** Most households of a trial: enough to warm up, little enough to stay within seconds. */
const TRIAL_HOUSEHOLDS = 20_000;

/** Runs the trial and scales it up. @throws {InputError} when a network of the study cannot be built */
export function estimateNeeds(prepared: Prepared): Needs {
  const { study } = prepared;
  const n = householdsOf(prepared);
  const trialStudy = smaller(study, n);
  const trialN = trialStudy.population.households ?? n;
  const trial: Prepared = { ...prepared, study: trialStudy };
  const store = memoryStore();
  let firstGeneration = 0;
  let generations = 0;
  const began = performance.now();
  runReplicate(trial, factsOf(trial), store, 0, () => {
    if (generations++ === 0) firstGeneration = performance.now();
  });
  const total = (performance.now() - began) / 1000;
  const later = generations > 1 ? (performance.now() - firstGeneration) / 1000 / (generations - 1) : total;
  const scale = n / trialN;
  const arms = study.arms.length;
  const fixed = Math.max(0, total - later * generations);
  const threads = Math.min(availableParallelism(), study.replicates);
  const seconds = (study.replicates * scale * (fixed + later * arms * study.generations)) / threads;

  const bytes = { panel: 0, rest: 0 };
  for (const name of store.list('')) {
    bytes[/panel\.(parquet|csv)$/.test(name) ? 'panel' : 'rest'] += store.size(name) ?? 0;
  }
  const kept = keptShare(study, n);
  const panel = (bytes.panel / generations) * arms * study.generations;
  const disk = study.replicates * scale * (panel * kept + bytes.rest);

  return {
    households: n,
    household_generations: arms * study.replicates * study.generations * n,
    memory_bytes: threads * (workerBytes(study, n) + 120e6) + 80e6,
    disk_bytes: Math.round(disk),
    seconds,
    threads,
  };
}

/** The study for the trial: one replicate, three generations, a population that takes seconds. */
function smaller(study: Study, n: number): Study {
  const generations = Math.min(3, study.generations);
  const base: Study = { ...study, replicates: 1, generations, keep: { ...study.keep, panel: 'all' } };
  const { households, places } = study.population;
  const fromFile = study.arms.some(
    ({ network }) =>
      'kind' in network &&
      (network.kind === 'file' ||
        network.kind === 'named' ||
        (network.kind === 'configuration' && network.degrees.kind === 'file')),
  );
  if (households === undefined || n <= TRIAL_HOUSEHOLDS || fromFile) return base;
  // places keep their size, so that what a place's network needs can still be met
  const count = Math.max(1, Math.round((places!.count * TRIAL_HOUSEHOLDS) / n));
  return {
    ...base,
    population: { ...study.population, households: TRIAL_HOUSEHOLDS, places: { ...places!, count } },
  };
}

/** Share of panel rows that are kept. */
function keptShare(study: Study, n: number): number {
  const { panel } = study.keep;
  if (panel === 'all') return 1;
  if (panel === 'none') return 0;
  return (
    Math.min(1, (panel.replicates ?? Infinity) / study.replicates) *
    Math.min(1, (panel.households ?? Infinity) / n) *
    (Math.ceil(study.generations / (panel.every ?? 1)) / study.generations)
  );
}

/** Bytes one worker holds: columns of a generation, ties of every arm, buffers of the panel. */
function workerBytes(study: Study, n: number): number {
  const milestones = Math.max(
    ...study.arms.map((arm) => (arm.reference?.milestones ?? study.reference.milestones).length),
  );
  const columns = 8 * (10 + 2 * milestones) + 16;
  const measures = 8 * 12;
  const rowGroup = Math.max(n, 65_536) * 8 * (22 + milestones);
  let ties = 0;
  for (const { network } of study.arms) ties += 8 * n * degreeOf(study, network) + 4 * n;
  return n * (columns + measures) + rowGroup * 1.5 + ties * 1.5;
}

function degreeOf(study: Study, network: Study['arms'][number]['network']): number {
  if ('from' in network) {
    const source = study.arms.find((arm) => arm.name === network.from);
    return source === undefined ? 10 : degreeOf(study, source.network);
  }
  if ('mean_degree' in network) return network.mean_degree;
  if (network.kind === 'ring') return network.degree;
  if (network.kind === 'preferential') return 2 * network.ties;
  return 10;
}

function text(study: Study, needs: Needs): string {
  const { replicates, generations, arms } = study;
  return [
    `${study.study}: no problems found.`,
    `${counted(arms.length, 'arm')} × ${counted(replicates, 'replicate')} × ${counted(generations, 'generation')} × ${amount(needs.households)} households ` +
      `= ${amount(needs.household_generations)} household-generations`,
    `memory  about ${size(needs.memory_bytes)} with ${counted(needs.threads, 'thread')}`,
    `disk    about ${size(needs.disk_bytes)} for the results, twice that while they are written`,
    `time    about ${duration(needs.seconds)} with ${counted(needs.threads, 'thread')} on this machine`,
  ].join('\n');
}
