/**
 * One replicate from start to finish: simulated, measured, written as parts. And what a study's tables will hold.
 *
 * Ties the loop (study/), the measures (measure/) and the writers of this folder together; works on any store, so
 * the same bytes come out on disk and in the browser.
 */

import type { ArmNetwork } from '../study/networks.js';
import { studyText } from '../study/parse.js';
import type { Recorder } from '../study/record.js';
import { type Prepared, simulate } from '../study/replicate.js';
import { BETWEENNESS_LIMIT, covariateFacts, type Facts } from './facts.js';
import { Measured, measureFacts, type OtherArm } from './measured.js';
import { PartWriter } from './parts.js';
import type { Store } from './store.js';

/** Number of households of a study. */
export function householdsOf(prepared: Prepared): number {
  return prepared.inputs.households?.n ?? prepared.study.population.households!;
}

/** What decides the columns of a study's tables. */
export function factsOf(prepared: Prepared): Facts {
  const { study, inputs } = prepared;
  return {
    milestones: Math.max(...study.arms.map((arm) => (arm.reference?.milestones ?? study.reference.milestones).length)),
    currency: study.currency,
    covariates: covariateFacts(inputs.households?.covariates ?? []),
    placeNames: inputs.households !== null,
    betweenness: householdsOf(prepared) <= BETWEENNESS_LIMIT,
    ...measureFacts(study),
  };
}

/** A study's text for hashing: every default written out, and every file's text, so that equal hashes mean equal runs. */
export function canonicalText(prepared: Prepared): string {
  const { study, inputs } = prepared;
  const files = Object.keys(inputs.texts)
    .sort()
    .map((path) => `--- ${path}\n${inputs.texts[path]}`);
  return [studyText(study), ...files].join('\n');
}

/**
 * Simulates, measures and writes one replicate.
 *
 * @param onGeneration - called after each decided generation of each arm
 * @throws {InputError} when a network cannot be built, {RunError} when wealth leaves the range of numbers
 */
export function runReplicate(
  prepared: Prepared,
  facts: Facts,
  store: Store,
  replicate: number,
  onGeneration: () => void,
): void {
  const { study } = prepared;
  const writer = new PartWriter({
    store,
    facts,
    formats: study.keep.formats,
    keep: study.keep.panel as ConstructorParameters<typeof PartWriter>[0]['keep'],
    replicate,
  });
  const networks = new Map<string, ArmNetwork>();
  const others = study.arms.length > 1 ? firstArms(prepared, replicate, networks) : [];
  // the first arm is compared with the second, every other one with the first
  const measured = new Measured(study, writer, (arm) => others[arm === 0 ? 1 : 0] ?? null);
  const recorder: Recorder = {
    armStarts: (record) => measured.armStarts(record),
    generation: (record) => {
      measured.generation(record);
      if (record.decided) onGeneration();
    },
    armEnds: () => measured.armEnds(),
  };
  simulate(prepared, replicate, recorder, undefined, networks);
  writer.commit();
}

/** Who is frustrated in the first two arms, generation by generation: a run of its own, before the one that is written. */
function firstArms(prepared: Prepared, replicate: number, networks: Map<string, ArmNetwork>): OtherArm[] {
  const arms: Uint8Array[][] = [];
  const recorder: Recorder = {
    armStarts: () => arms.push([]),
    generation: ({ decided, columns }) => {
      if (!decided) return;
      const { met } = columns;
      const frustrated = new Uint8Array(met.length);
      for (let i = 0; i < met.length; i++) frustrated[i] = met[i] === 0 ? 1 : 0;
      arms.at(-1)!.push(frustrated);
    },
    armEnds: () => {},
  };
  const names = prepared.study.arms.slice(0, 2).map((arm) => arm.name);
  simulate(prepared, replicate, recorder, names, networks);
  return arms;
}
