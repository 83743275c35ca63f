/**
 * One replicate of a study: the same households and luck through every arm, generation by generation.
 *
 * Pure: no files, no clock. Hands each generation to a recorder and keeps nothing.
 */
import { RunError } from '../../network/errors.js';
import { createEngine, makeGeneration, withReference } from '../model/generation.js';
import { Draws } from '../random/draws.js';
import { compileHouseholds, compileModel } from './compile.js';
import type { Study } from './complete.js';
import type { Inputs } from './inputs.js';
import { type ArmNetwork, buildNetworks } from './networks.js';
import { drawPopulation } from './population.js';
import type { Recorder } from './record.js';

/** A study with the files it names, ready to simulate; plain data that can be sent to a worker. */
export interface Prepared {
  readonly study: Study;
  readonly inputs: Inputs;
}

/**
 * Simulates every arm of one replicate.
 *
 * @param replicate - 0 … replicates − 1
 * @param recorder - told of arms and generations in order; columns are overwritten after each call
 * @param only - arms to simulate (their sources are built, not simulated); all when left out
 * @param built - networks of this replicate built before; those missing are added
 * @throws {RunError} when wealth leaves the range of numbers, with arm and generation
 */
export function simulate(
  prepared: Prepared,
  replicate: number,
  recorder: Recorder,
  only?: readonly string[],
  built: Map<string, ArmNetwork> = new Map(),
): void {
  const { study, inputs } = prepared;
  const draws = new Draws(study.seed, replicate);
  const population = drawPopulation(study, inputs, draws);
  const { n, wealth } = population.labels;
  const arms = only === undefined ? study.arms : study.arms.filter((arm) => only.includes(arm.name));
  const networks = buildNetworks(prepared, population, replicate, arms, built);
  const milestones = Math.max(...arms.map((arm) => (arm.reference?.milestones ?? study.reference.milestones).length));

  const columns = makeGeneration(n, milestones);
  const parentWealth = new Float64Array(n);
  const inherited = columns.aspirations.map(() => new Float64Array(n));
  arms.forEach((arm) => {
    const model = compileModel(study, arm, population.groupNames);
    const households = compileHouseholds(study, arm, population);
    const { ties, report } = networks.get(arm.name)!;
    const engine = createEngine(model, households, ties);
    const own = milestonesOf(columns, model.milestones.length);
    recorder.armStarts({
      arm: arm.name,
      armIndex: study.arms.indexOf(arm),
      replicate,
      generations: study.generations,
      households,
      labels: population.labels,
      groupNames: population.groupNames,
      placeNames: population.placeNames,
      householdIds: population.householdIds,
      covariates: population.covariates,
      treated: null,
      model,
      ties,
      network: report,
    });
    own.wealth.set(wealth);
    const society = withReference(model, 'society', 'mean');
    for (let t = 0; t < study.generations; t++) {
      const from = t === 0 || model.persistence === 0 ? null : inherited;
      engine.step(draws, t, own, from);
      checkRange(own.childWealth, arm.name, t);
      recorder.generation({
        generation: t,
        decided: true,
        columns: own,
        parentWealth: t === 0 ? null : parentWealth,
        ties,
        underSociety: () => engine.resolveUnder(society, own, from),
        tiesChanged: t === 0,
      });
      if (model.persistence > 0) own.aspirations.forEach((column, m) => void inherited[m]!.set(column));
      parentWealth.set(own.wealth);
      own.wealth.set(own.childWealth);
    }
    recorder.generation({
      generation: study.generations,
      decided: false,
      columns: own,
      parentWealth,
      ties,
      underSociety: null,
      tiesChanged: false,
    });
    recorder.armEnds();
  });
}

/** The shared columns with as many aspirations as the arm has milestones. */
function milestonesOf(columns: ReturnType<typeof makeGeneration>, milestones: number): typeof columns {
  return milestones === columns.aspirations.length
    ? columns
    : { ...columns, aspirations: columns.aspirations.slice(0, milestones) };
}

function checkRange(childWealth: Float64Array, arm: string, t: number): void {
  for (let i = 0; i < childWealth.length; i++) {
    const y = childWealth[i];
    if (y > 1e-290 && y < 1e290) continue;
    throw new RunError(
      `arm '${arm}' generation ${t}`,
      `household ${i}'s child wealth is ${y}, outside the range that numbers can hold`,
      'simulate fewer generations, or choose a technology and child weight with growth nearer 1',
    );
  }
}
