/**
 * `run`: a study, all arms and replicates, to a results folder; prints the answer.
 *
 * Replicates are tasks of a worker pool and write their own parts, so the result does not depend on the number of
 * workers, and what is done when a run is stopped is kept.
 */
import { existsSync } from 'node:fs';
import { availableParallelism } from 'node:os';
import { basename, join, relative, resolve } from 'node:path';
import { type Command, Option } from 'commander';
import { Piscina } from 'piscina';
import { describe, InputError, RunError } from '../../network/errors.js';
import { type Answer, answerText } from '../results/answer.js';
import type { Facts } from '../results/facts.js';
import { finishTables } from '../results/finish.js';
import { type RunFolder, resumeRun, startRun, studyHash } from '../results/folder.js';
import { canonicalText, factsOf, householdsOf } from '../results/run-replicate.js';
import type { Study } from '../study/complete.js';
import { studyText } from '../study/parse.js';
import { portable } from '../study/portable.js';
import { VERSION } from '../version.js';
import { addEstimatesAndReport } from './estimate-after.js';
import { wholeNumber } from './options.js';
import { counted, duration, progress } from './progress.js';
import type { Outcome, WorkerSetup } from './run-worker.js';
import { placed, readStudy, type StudyOnDisk } from './study-files.js';

interface RunOptions {
  readonly out?: string;
  readonly threads?: number;
  readonly replicates?: number;
  readonly resume?: string;
  readonly view?: boolean;
  readonly json?: true;
}

export function runCommand(program: Command): void {
  program
    .command('run')
    .argument('[study]', 'a study file, or the name of a built-in study')
    .option('--out <folder>', 'results folder to make (default: results/ and the name of the study file)')
    .addOption(
      new Option('--threads <n>', 'worker threads (default: one a processor)').argParser(wholeNumber('--threads', 1)),
    )
    .addOption(
      new Option('--replicates <n>', "replicates, instead of the study's").argParser(wholeNumber('--replicates', 1)),
    )
    .option('--resume <folder>', 'go on with a run that was stopped')
    .option('--view', 'open the viewer afterwards (not without a terminal; stop it with Ctrl-C)')
    .option('--no-view', 'do not open the viewer')
    .option('--json', 'machine-readable result on standard output')
    .summary('run a study: all arms and replicates, to a results folder')
    .description(
      'Simulates every arm and replicate of a study, writes a results folder and prints the answer.\n' +
        'Ctrl-C stops; what is done is kept and --resume goes on from there.',
    )
    .addHelpText(
      'after',
      '\nExamples:\n  rungsight run villages-apart\n  rungsight run my-study.yaml --out results/first --threads 2\n' +
        '  rungsight run --resume results/first',
    )
    .action(async (study: string | undefined, options: RunOptions) => {
      await run(study, options);
    });
}

async function run(given: string | undefined, options: RunOptions): Promise<void> {
  const began = performance.now();
  const quiet = options.json === true;
  const say = (text: string): void => {
    if (!quiet) console.error(text);
  };
  const { disk, folder } = await open(given, options);
  const { study } = disk.prepared;
  const facts = factsOf(disk.prepared);
  const arms = study.arms.length;
  const n = householdsOf(disk.prepared);
  if (folder.finished) {
    // stopped after its last file was written: only the folder's name was missing
    if (quiet) console.log(JSON.stringify({ folder: folder.out, problems: [] }, null, 2));
    else
      console.log(`Results are in ${shown(folder.out)}: the run was complete, only its folder had not been renamed.`);
    return;
  }
  const done = folder.completeReplicates();
  const todo = Array.from({ length: study.replicates }, (_, r) => r).filter((r) => !done.includes(r));
  say(
    `${study.study}: ${counted(arms, 'arm')}, ${counted(study.replicates, 'replicate')}, ` +
      `${counted(study.generations, 'generation')}, ${n} households` +
      (done.length > 0 ? `; ${done.length} replicates are there already` : ''),
  );

  await simulateAll(disk, folder, facts, todo, options.threads ?? availableParallelism(), n, quiet);

  say('writing tables');
  await folder.assemble(facts, study.keep.formats);
  const { answer, notes, tables } = finishTables(folder.store, facts, study);
  for (const { name, rows } of tables) folder.writeTable(facts, name, rows);
  folder.writeCodebook(facts);
  say('writing the report');
  const added = await addEstimatesAndReport(folder, study, disk.parsed.place, notes);
  const seconds = (performance.now() - began) / 1000;
  await folder.finish({ seconds, peakMemory: process.resourceUsage().maxRSS * 1024, notes });
  if (quiet) {
    console.log(JSON.stringify({ folder: folder.out, seconds, answer, problems: added.problems }, null, 2));
  } else {
    for (const problem of added.problems) console.error(describe(problem));
    console.log(
      finalText(
        answer,
        folder.out,
        seconds,
        folder.manifest.files.map((file) => file.name),
      ),
    );
  }
  if (options.view === true) await viewAfter(folder.out, quiet);
}

/** Reads the study and makes, or takes up, its results folder. Nothing is written before all is checked. */
async function open(given: string | undefined, options: RunOptions): Promise<{ disk: StudyOnDisk; folder: RunFolder }> {
  if (options.resume !== undefined) {
    if (options.out !== undefined || options.replicates !== undefined) {
      throw new InputError({
        code: 'options-exclude',
        place: options.out !== undefined ? '--out' : '--replicates',
        problem: 'a run that goes on keeps its folder and its replicates',
        remedy: 'leave it out, or start a new run',
      });
    }
    const folder = resumeRun(options.resume, { version: VERSION });
    const disk = local(await readStudy(given ?? join(folder.finished ? folder.out : folder.partial, 'study.yaml')));
    if (studyHash(canonicalText(disk.prepared)) !== folder.manifest.study_hash) {
      throw new InputError({
        code: 'other-study',
        place: given ?? options.resume,
        problem: `this is not the study that ${options.resume} was started with`,
        remedy: 'resume without naming a study, or start a new run',
      });
    }
    return { disk, folder };
  }
  if (given === undefined) {
    throw new InputError({
      code: 'missing-argument',
      place: 'run',
      problem: 'no study was named',
      remedy: "give a study file or a built-in study ('rungsight presets' lists them)",
    });
  }
  const read = local(await readStudy(given));
  const disk = options.replicates === undefined ? read : withReplicates(read, options.replicates);
  const { study, inputs } = disk.prepared;
  const out = options.out ?? freeFolder(basename(disk.file).replace(/\.ya?ml$/i, ''));
  const folder = startRun(out, {
    head: {
      version: VERSION,
      study: study.study,
      studyHash: studyHash(canonicalText(disk.prepared)),
      seed: study.seed,
      arms: study.arms.map((arm) => arm.name),
      replicates: study.replicates,
      generations: study.generations,
      households: householdsOf(disk.prepared),
      started: new Date().toISOString(),
    },
    studyYaml: studyText(study),
  });
  for (const [path, text] of Object.entries(inputs.texts)) folder.writeFile(path, text);
  return { disk, folder };
}

/** With its files under the names they have in the results folder. */
function local(disk: StudyOnDisk): StudyOnDisk {
  return { ...disk, prepared: portable(disk.prepared) };
}

function withReplicates(disk: StudyOnDisk, replicates: number): StudyOnDisk {
  const study: Study = { ...disk.prepared.study, replicates };
  return { ...disk, prepared: { ...disk.prepared, study } };
}

/** `results/NAME`, or the first of NAME-2, NAME-3 … that is not taken. */
function freeFolder(name: string): string {
  for (let k = 1; ; k++) {
    const folder = join('results', k === 1 ? name : `${name}-${k}`);
    if (!existsSync(folder) && !existsSync(`${folder}.partial`)) return folder;
  }
}

async function simulateAll(
  disk: StudyOnDisk,
  folder: RunFolder,
  facts: Facts,
  todo: readonly number[],
  threads: number,
  n: number,
  quiet: boolean,
): Promise<void> {
  if (todo.length === 0) return;
  const { study } = disk.prepared;
  const done = new Int32Array(new SharedArrayBuffer(4));
  const setup: WorkerSetup = { prepared: disk.prepared, facts, folder: folder.partial, done };
  const pool = new Piscina({
    filename: new URL('./run-worker.js', import.meta.url).href,
    workerData: setup,
    minThreads: 1,
    maxThreads: Math.min(threads, todo.length),
    concurrentTasksPerWorker: 1,
    // a population of millions needs more than a worker's default heap
    resourceLimits: { maxOldGenerationSizeMb: 8192 },
  });
  const bar = progress(todo.length * study.arms.length * study.generations, 'household-generations', n, quiet);
  const timer = setInterval(() => bar.update(Atomics.load(done, 0)), 200);
  let stopped = false;
  const stop = (): void => {
    if (stopped) process.exit(1);
    stopped = true;
    void pool.destroy();
  };
  process.on('SIGINT', stop);
  process.on('SIGTERM', stop);
  try {
    await Promise.all(
      todo.map(async (replicate) => {
        const outcome = (await pool.run(replicate)) as Outcome;
        if (outcome.ok) return;
        if ('problems' in outcome) throw new InputError(placed(outcome.problems, disk.parsed));
        throw new RunError(`replicate ${replicate}`, ...splitMessage(outcome.failed));
      }),
    );
  } catch (error) {
    if (!stopped) {
      await pool.destroy();
      if (error instanceof InputError && folder.completeReplicates().length === 0) folder.discard();
      throw error;
    }
  } finally {
    clearInterval(timer);
    bar.stop();
    process.off('SIGINT', stop);
    process.off('SIGTERM', stop);
  }
  if (stopped) {
    const whole = folder.completeReplicates().length;
    throw new RunError(
      'stopped',
      `${whole} of ${study.replicates} replicates are kept in ${shown(folder.partial)}`,
      `go on with: npx rungsight run --resume ${shown(folder.out)}`,
    );
  }
  await pool.destroy();
}

/** What went wrong and what to do, from an error's one line `where: what; remedy`. */
function splitMessage(message: string): [string, string] {
  const at = message.lastIndexOf('; ');
  return at < 0 ? [message, 'correct the study'] : [message.slice(0, at), message.slice(at + 2)];
}

function shown(path: string): string {
  const short = relative(process.cwd(), resolve(path));
  return short.startsWith('..') ? path : short;
}

/** Files a reader opens first, where the run made them. */
const DESCRIBED: readonly [file: string, what: string][] = [
  ['report.html', 'the answer with figures and the model, to read, print or send'],
  ['indicators.csv', 'every measure, by arm, replicate and generation'],
  ['contrasts.csv', 'arm against arm, with intervals'],
  ['panel.parquet', 'every household in every generation, for regressions'],
  ['panel.csv', 'the same as text'],
  ['estimates.csv', "the study's regressions; panel.R and panel.py rerun them"],
  ['codebook.md', 'what each column means'],
];

function finalText(answer: Answer, out: string, seconds: number, files: readonly string[]): string {
  const folder = shown(out);
  const view = `npx rungsight view ${folder}`;
  const width = Math.max(view.length, 22);
  return [
    '',
    answerText(answer),
    '',
    `Results are in ${folder} (${duration(seconds)}):`,
    ...DESCRIBED.filter(([file]) => files.includes(file)).map(([file, what]) => `  ${file.padEnd(17)}${what}`),
    '',
    'Next:',
    `  ${view.padEnd(width)}   look at it in the browser`,
    `  ${'npx rungsight presets'.padEnd(width)}   the built-in studies, to edit`,
  ].join('\n');
}

/** Serves the viewer until Ctrl-C; says why not where there is no terminal. */
async function viewAfter(out: string, quiet: boolean): Promise<void> {
  if (!process.stdout.isTTY || quiet) {
    if (!quiet) console.log(`\nNo terminal, so the viewer is not opened. To see it: npx rungsight view ${shown(out)}`);
    return;
  }
  const { serveViewer } = await import('./view.js');
  const served = await serveViewer({ dir: out });
  console.log(`\nThe viewer is at ${served.url}  (Ctrl-C stops it; 'npm start -- --no-view' skips it)`);
}
