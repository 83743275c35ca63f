/**
 * One million households with ten ties each: household-generations a second, beside a C program with the same algorithm
 * (engine.c, gcc -O3, one thread) and the numpy and scipy script a user would otherwise write (engine.py), in one run.
 *
 * Cases: (i) linear technology, one milestone, mean of neighbours, households numbered along the network (local) or at
 * random; (ii) concave technology, two milestones, upward mean. Checksums of C and engine must agree to the last bit;
 * the script draws other shocks and must agree in distribution. Run: npm run bench [-- HOUSEHOLDS]
 */
import { execFileSync, spawnSync } from 'node:child_process';
import { closeSync, mkdtempSync, openSync, rmSync, writeSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { isMainThread, parentPort, Worker, workerData } from 'node:worker_threads';
import { TABLES } from '../../network/elementary.js';
import { fromPairs, type Ties } from '../../network/graph.js';
import { createEngine, type Engine, makeGeneration } from '../../sim/model/generation.js';
import { GrowthTableChoice } from '../../sim/model/growth-table.js';
import type { Households, Model, Part } from '../../sim/model/types.js';
import { Draws, PURPOSES, seedKey } from '../../sim/random/draws.js';
import { stream } from '../../sim/random/stream.js';

type Case = 'linear' | 'concave';

const GENERATIONS: Record<Case, number> = { linear: 10, concave: 3 };
const REPEATS = 3;
const SEED = 'bench';

function part(from: Part['from'], statistic: Part['statistic'], weight: number): Part {
  return { from, statistic, weight, q: 0.5, window: 1 };
}

function modelOf(name: Case): Model {
  const mix = [part('self', 'mean', 0.2), part('neighbours', name === 'linear' ? 'mean' : 'upward_mean', 0.8)];
  return {
    technology:
      name === 'linear'
        ? { kind: 'linear', grossReturn: 2.5 }
        : { kind: 'concave', scale: 8, elasticity: 0.6, depreciation: 1 },
    shock: { sdLog: 0.2, sharedByPlace: 0, risk: 'planned' },
    preferences: [
      {
        curvature: 0.6,
        childWeight: 0.5,
        milestoneShape: 'threshold',
        milestoneCurvature: 0.6,
        lossAversion: 1,
      },
    ],
    milestones:
      name === 'linear'
        ? [{ weight: 0.6, scale: 1, mix }]
        : [
            { weight: 1, scale: 1, mix },
            { weight: 0.5, scale: 1.4, mix },
          ],
    persistence: 0,
  };
}

/** A ring in which everyone knows the five before and the five after, numbered along it or shuffled. */
function ring(n: number, shuffled: boolean): Ties {
  const number = Uint32Array.from({ length: n }, (_, i) => i);
  if (shuffled) {
    const uniform = stream(SEED, 0, 'shuffle');
    for (let i = n - 1; i > 0; i--) {
      const j = Math.floor(uniform() * (i + 1));
      const kept = number[i];
      number[i] = number[j];
      number[j] = kept;
    }
  }
  const source = new Uint32Array(5 * n);
  const target = new Uint32Array(5 * n);
  for (let i = 0; i < n; i++) {
    for (let step = 1; step <= 5; step++) {
      source[5 * i + step - 1] = number[i];
      target[5 * i + step - 1] = number[(i + step) % n];
    }
  }
  return fromPairs(n, source, target, null);
}

function householdsOf(n: number, model: Model): Households {
  return {
    n,
    place: new Uint32Array(n),
    places: 1,
    group: new Uint32Array(n),
    groups: 1,
    childWeight: new Float64Array(n).fill(model.preferences[0].childWeight),
  };
}

function initialWealth(n: number): Float64Array {
  const wealth = new Float64Array(n);
  new Draws(SEED, 0).normals('initialWealth', 0, wealth);
  for (let i = 0; i < n; i++) wealth[i] = 50 * Math.exp(0.7 * wealth[i]);
  return wealth;
}

/** Processor time of this process: what a busy machine takes from others does not count. */
function processorSeconds(): number {
  const { user, system } = process.cpuUsage();
  return (user + system) / 1e6;
}

interface Outcome {
  readonly seconds: number;
  readonly sum: number;
  readonly unmet: number;
  readonly reached: number;
}

function run(engine: Engine, n: number, generations: number, replicate: number): Outcome {
  const generation = makeGeneration(n, engine.model.milestones.length);
  const draws = new Draws(SEED, replicate);
  generation.wealth.set(initialWealth(n));
  const began = processorSeconds();
  for (let t = 0; t < generations; t++) {
    engine.step(draws, t, generation, null);
    generation.wealth.set(generation.childWealth);
  }
  const seconds = processorSeconds() - began;
  let sum = 0;
  let unmet = 0;
  let reached = 0;
  for (let i = 0; i < n; i++) {
    sum += generation.childWealth[i] + generation.consumption[i];
    if (generation.met[i] === 0) unmet++;
    reached += generation.reached[i] + generation.isolated[i];
  }
  return { seconds, sum, unmet, reached };
}

/** Header, tables, network and wealth, as engine.c and engine.py read them. */
function writeInput(path: string, ties: Ties, engine: Engine): void {
  const model = engine.model;
  const choice = engine.choices[0];
  const table = choice instanceof GrowthTableChoice ? choice : null;
  const [low, high] = seedKey(SEED);
  const concave = model.technology.kind === 'concave' ? model.technology : null;
  const header = new Float64Array(32);
  header.set([ties.n, ties.target.length, low, high, model.shock.sdLog, table?.grossReturn ?? 0]);
  header.set(
    [table?.threshold ?? 0, table?.low ?? 0, table?.cells ?? 0, model.preferences[0].childWeight, 0.2, 0.8],
    6,
  );
  header.set([PURPOSES.householdShock, concave?.scale ?? 0, concave?.elasticity ?? 0], 12);
  header.set([model.preferences[0].curvature], 15);
  model.milestones.forEach((milestone, m) => {
    header[16 + m] = milestone.weight;
    header[18 + m] = milestone.scale;
  });
  header.set([TABLES.ln2High, TABLES.ln2Low, TABLES.stepHigh, TABLES.stepLow, TABLES.perStep], 20);
  const file = openSync(path, 'w');
  const pieces = [header, TABLES.log, TABLES.exp, TABLES.powerOfTwo, table?.coefficients ?? new Float64Array(0)];
  for (const piece of [...pieces, ties.start, ties.target, initialWealth(ties.n)]) writeSync(file, piece);
  closeSync(file);
}

function external(command: string, args: readonly string[]): Record<string, number> | null {
  const env = { ...process.env };
  // numpy's linear algebra picks its own kernels; nothing here depends on them
  delete env['OPENBLAS_CORETYPE'];
  delete env['OPENBLAS_L2_SIZE'];
  const done = spawnSync(command, args, { encoding: 'utf8', env });
  if (done.status !== 0) {
    console.error(`${command} failed: ${done.stderr}`);
    return null;
  }
  return JSON.parse(done.stdout) as Record<string, number>;
}

function millions(n: number, generations: number, seconds: number): number {
  return (n * generations) / seconds / 1e6;
}

/** Two replicates on two threads that share the network. */
async function onTwoThreads(name: Case, ties: Ties, generations: number): Promise<number> {
  const share = (column: Uint32Array): Uint32Array => {
    const shared = new Uint32Array(new SharedArrayBuffer(column.byteLength));
    shared.set(column);
    return shared;
  };
  const data = { name, n: ties.n, start: share(ties.start), target: share(ties.target), generations };
  // a worker does not inherit the loader that lets this file run without compiling
  const loader = JSON.stringify(import.meta.resolve('tsx/esm/api'));
  const entry = `import(${loader}).then(({ register }) => (register(), import(${JSON.stringify(import.meta.url)})))`;
  const workers = [0, 1].map((replicate) => new Worker(entry, { eval: true, workerData: { ...data, replicate } }));
  const once = (worker: Worker): Promise<unknown> =>
    new Promise((done, fail) => {
      worker.once('message', done);
      worker.once('error', fail);
    });
  await Promise.all(workers.map(once));
  const began = performance.now();
  const finished = workers.map(once);
  for (const worker of workers) worker.postMessage('go');
  await Promise.all(finished);
  const seconds = (performance.now() - began) / 1000;
  await Promise.all(workers.map((worker) => worker.terminate()));
  return millions(2 * ties.n, generations, seconds);
}

function work(): void {
  const { name, n, start, target, generations, replicate } = workerData as {
    name: Case;
    n: number;
    start: Uint32Array;
    target: Uint32Array;
    generations: number;
    replicate: number;
  };
  const model = modelOf(name);
  const engine = createEngine(model, householdsOf(n, model), { n, start, target, weight: null });
  run(engine, n, 1, replicate);
  parentPort?.once('message', () => {
    run(engine, n, generations, replicate);
    parentPort?.postMessage('done');
  });
  parentPort?.postMessage('ready');
}

async function main(): Promise<void> {
  const n = Number(process.argv[2] ?? 1_000_000);
  const here = dirname(fileURLToPath(import.meta.url));
  const folder = mkdtempSync(join(tmpdir(), 'engine-bench-'));
  let failed = false;
  try {
    const program = join(folder, 'engine');
    execFileSync('gcc', ['-O3', '-ffp-contract=off', '-o', program, join(here, 'engine.c'), '-lm']);
    console.log(
      `${n} households, ten ties each; millions of household-generations a second of processor time, best of ${REPEATS};\ntwo threads: by the clock\n`,
    );
    console.log('case                          engine     C    script   engine/C   engine/script');
    const cases: [string, Case, boolean][] = [
      ['(i) linear, local order', 'linear', false],
      ['(i) linear, random order', 'linear', true],
      ['(ii) concave, local order', 'concave', false],
      ['(ii) concave, random order', 'concave', true],
    ];
    for (const [label, name, shuffled] of cases) {
      const generations = GENERATIONS[name];
      const ties = ring(n, shuffled);
      const model = modelOf(name);
      const engine = createEngine(model, householdsOf(n, model), ties);
      const input = join(folder, 'input');
      writeInput(input, ties, engine);
      run(engine, n, 1, 0);
      let ours = Infinity;
      let theirs = Infinity;
      // in turns, so that a busy machine is busy for both
      for (let repeat = 0; repeat < REPEATS; repeat++) {
        const outcome = run(engine, n, generations, 0);
        const c = external(program, [input, String(generations), name]);
        ours = Math.min(ours, outcome.seconds);
        if (
          c === null ||
          c['sum'] !== outcome.sum ||
          c['unmet'] !== outcome.unmet ||
          c['reached'] !== outcome.reached
        ) {
          console.error(`${label}: checksums differ: ${JSON.stringify(outcome)} against ${JSON.stringify(c)}`);
          failed = true;
        } else theirs = Math.min(theirs, c['seconds']);
      }
      const script = external('python3', [join(here, 'engine.py'), input, String(generations), name]);
      const rate = millions(n, generations, ours);
      const ofC = millions(n, generations, theirs);
      const ofScript = script === null ? Number.NaN : millions(n, generations, script['seconds']);
      const figures = [rate, ofC, ofScript].map((figure) => figure.toFixed(2).padStart(8)).join(' ');
      console.log(
        `${label.padEnd(28)}${figures}   ${(rate / ofC).toFixed(2).padStart(6)}   ${(rate / ofScript).toFixed(1).padStart(8)}`,
      );
      if (script !== null) {
        const share = run(engine, n, generations, 1).unmet / n;
        // other luck, a million households: the shares differ by sampling alone, far below a hundredth
        if (Math.abs(script['unmet'] / n - share) > 0.01) {
          console.error(`${label}: share with no milestone met ${script['unmet'] / n} in the script, ${share} here`);
          failed = true;
        }
      }
      if (name === 'concave') {
        console.log(
          `${''.padEnd(28)}${(await onTwoThreads(name, ties, generations)).toFixed(2).padStart(8)} on two threads`,
        );
      }
    }
    reportMemory(n);
  } finally {
    rmSync(folder, { recursive: true });
  }
  if (failed) process.exitCode = 1;
}

/** Bytes of typed arrays that a population holds besides its ties. */
function reportMemory(n: number): void {
  const ties = ring(n, false);
  for (const name of ['linear', 'concave'] as const) {
    const model = modelOf(name);
    const households = householdsOf(n, model);
    const engine = createEngine(model, households, ties);
    const generation = makeGeneration(n, model.milestones.length);
    generation.wealth.fill(1);
    engine.step(new Draws(SEED, 0), 0, generation, null);
    // besides: the row kernel's copy of wealth and of the ties
    const bytes = bytesOf([households, engine, generation]) - bytesOf([ties]) + 8 * n;
    console.log(
      `memory, ${model.milestones.length} milestone(s): ${(bytes / n).toFixed(1)} bytes a household, ` +
        `${ties.target.byteLength / ties.target.length + 4} a tie end and ${(ties.start.byteLength / n).toFixed(0)} a row of ties`,
    );
  }
}

/** Bytes of all typed arrays within reach of an object, each buffer once. */
function bytesOf(root: unknown): number {
  const seen = new Set<unknown>();
  let bytes = 0;
  const visit = (value: unknown): void => {
    if (typeof value !== 'object' || value === null || seen.has(value)) return;
    seen.add(value);
    if (ArrayBuffer.isView(value)) {
      if (!seen.has(value.buffer)) bytes += value.buffer.byteLength;
      seen.add(value.buffer);
    } else for (const inner of Object.values(value)) visit(inner);
  };
  visit(root);
  return bytes;
}

if (isMainThread) await main();
else work();
