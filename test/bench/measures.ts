/**
 * What measuring costs: a replicate with every measure against the same replicate simulated and written alone.
 *
 *     npx tsx test/bench/measures.ts
 *
 * The two are run in turn, so that a change in the machine's speed meets both; medians and their ratio are printed. Then
 * one generation of measures at 100,000 and at one million households, to see that the cost grows in proportion.
 */
import { readFileSync } from 'node:fs';
import type { Facts } from '../../sim/results/facts.js';
import { PartWriter } from '../../sim/results/parts.js';
import { factsOf, runReplicate } from '../../sim/results/run-replicate.js';
import { memoryStore } from '../../sim/results/store.js';
import type { Study } from '../../sim/study/complete.js';
import type { Inputs } from '../../sim/study/inputs.js';
import { parseStudy } from '../../sim/study/parse.js';
import { type Prepared, simulate } from '../../sim/study/replicate.js';

const NO_FILES: Inputs = { households: null, sample: null, ties: {}, degrees: {}, texts: {} };

function prepared(change: (study: Study) => Study): Prepared {
  const file = new URL('../../presets/villages-apart.yaml', import.meta.url);
  return { study: change(parseStudy(readFileSync(file, 'utf8'), 'villages-apart.yaml').study), inputs: NO_FILES };
}

/** Simulated and written, with no measure beyond the engine's own columns. */
function bare(of: Prepared, replicate: number): void {
  const facts: Facts = { ...factsOf(of), extras: [], indicators: [], evidence: [] };
  const writer = new PartWriter({
    store: memoryStore(),
    facts,
    formats: ['parquet'],
    keep: of.study.keep.panel as 'all' | 'none',
    replicate,
  });
  simulate(of, replicate, {
    armStarts: (record) => writer.armStarts(record),
    generation: (record) => writer.generation(record),
    armEnds: () => writer.armEnds(),
  });
  writer.commit();
}

function measured(of: Prepared, replicate: number): void {
  runReplicate(of, factsOf(of), memoryStore(), replicate, () => {});
}

function milliseconds(work: () => void): number {
  const began = performance.now();
  work();
  return performance.now() - began;
}

const median = (x: number[]): number => x.sort((a, b) => a - b)[Math.floor(x.length / 2)]!;

const small = prepared((study) => ({ ...study, population: { ...study.population, households: 2000 } }));
const times = { bare: [] as number[], measured: [] as number[] };
for (let r = 0; r < 7; r++) {
  const b = milliseconds(() => bare(small, r));
  const m = milliseconds(() => measured(small, r));
  // the first two rounds warm the compiler up
  if (r < 2) continue;
  times.bare.push(b);
  times.measured.push(m);
}
const [b, m] = [median(times.bare), median(times.measured)];
console.log('2 arms of 2,000 households, 10 generations, one replicate (median of 5)');
console.log(`  simulated and written       ${b.toFixed(0)} ms`);
console.log(`  with every measure          ${m.toFixed(0)} ms    ratio ${(m / b).toFixed(2)} (aim: at most 2)`);

console.log('one arm, three generations, no panel: measures alone, by population');
let before = 0;
for (const n of [100_000, 1_000_000]) {
  const large = prepared((study) => ({
    ...study,
    generations: 3,
    arms: study.arms.slice(0, 1),
    keep: { ...study.keep, panel: 'none' },
    population: { ...study.population, households: n, places: { count: Math.round(n / 75), size_cv: 0.2 } },
  }));
  const alone = milliseconds(() => bare(large, 0));
  const all = milliseconds(() => measured(large, 0));
  const perHousehold = ((all - alone) * 1000) / (n * 3);
  console.log(
    `  ${n.toLocaleString('en')} households: ${((all - alone) / 1000).toFixed(1)} s, ${perHousehold.toFixed(2)} µs a household and generation` +
      `${before > 0 ? `, ${(perHousehold / before).toFixed(2)} times that at a tenth` : ''}`,
  );
  before = perHousehold;
}
