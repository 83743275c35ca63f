/**
 * One replicate from start to finish: simulated, measured, written as parts. And what a study's tables will hold.
 *
 * Ties the loop (study/), the measures (measure/) and the writers of this folder together; works on any store, so
 * the same bytes come out on disk and in the browser.
 */

import { studyText } from '../study/parse.js';
import type { Prepared } from '../study/replicate.js';
import { simulate } from '../study/replicate.js';
import { BETWEENNESS_LIMIT, covariateFacts, type Facts } from './facts.js';
import { Measured, measureFacts } from './measured.js';
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
  const measured = new Measured(study, writer);
  simulate(prepared, replicate, {
    armStarts: (record) => measured.armStarts(record),
    generation: (record) => {
      measured.generation(record);
      if (record.decided) onGeneration();
    },
    armEnds: () => measured.armEnds(),
  });
  writer.commit();
}
