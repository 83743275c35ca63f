/**
 * One generation of every household: aspirations, choice, shock, outcome, in columns made once and reused.
 *
 * The caller owns time: it fills `wealth`, applies changes, steps, records, and carries child wealth over.
 */
import type { Ties } from '../../network/graph.js';
import { CHUNK, type Kernel, kernel } from '../kernel/kernel.js';
import type { Draws } from '../random/draws.js';
import { type Choice, compileChoice } from './choice.js';
import { GrowthTableChoice, growthAt } from './growth-table.js';
import { PlannedChoice } from './planned.js';
import { compileReference, type Reference } from './reference.js';
import { drawShocks, placeShocks, shockChunk } from './shock.js';
import type { Generation, Households, Milestone, Model, Part, Shock } from './types.js';

/** Columns for n households: 51 + 8·milestones bytes a household. */
export function makeGeneration(n: number, milestones: number): Generation {
  return {
    wealth: new Float64Array(n),
    aspirations: Array.from({ length: milestones }, () => new Float64Array(n)),
    investment: new Float64Array(n),
    consumption: new Float64Array(n),
    planned: new Float64Array(n),
    shock: new Float64Array(n),
    childWealth: new Float64Array(n),
    met: new Uint8Array(n),
    reached: new Uint8Array(n),
    isolated: new Uint8Array(n),
  };
}

/** What every household would do under another reference, all else equal. */
export interface Resolved {
  /** Milestones met by that plan, length n. */
  readonly met: Uint8Array;
  /** z of that plan, length n; growth with the same luck is z·ε/y. */
  readonly planned: Float64Array;
  readonly aspirations: readonly Float64Array[];
}

export interface Engine {
  readonly model: Model;
  readonly reference: Reference;
  /** By group index. Shared with the engines made by `withTies`. */
  readonly choices: readonly Choice[];
  /**
   * Reads `generation.wealth` and fills every other column.
   *
   * @param t - generation 0 … T−1, names the draws
   * @param inherited - aspirations of generation t−1, a column a milestone; null at t = 0
   * @param aspirationFactor - multiplies each household's mix, or null
   */
  step(
    draws: Draws,
    t: number,
    generation: Generation,
    inherited: readonly Float64Array[] | null,
    aspirationFactor?: Float64Array | null,
  ): void;
  /** The choices of the same generation under other milestones (same number), everything else equal. */
  resolveUnder(
    milestones: readonly Milestone[],
    generation: Generation,
    inherited: readonly Float64Array[] | null,
    aspirationFactor?: Float64Array | null,
  ): Resolved;
  /** The same model and households under other ties. */
  withTies(ties: Ties): Engine;
}

/** The model's milestones, weights and scales kept, with one part as the whole of every mix. */
export function withReference(model: Model, from: Part['from'], statistic: Part['statistic']): Milestone[] {
  return model.milestones.map((milestone) => ({
    weight: milestone.weight,
    scale: milestone.scale,
    mix: [{ from, statistic, weight: 1, q: 0.5, window: 0.5 }],
  }));
}

export function createEngine(model: Model, households: Households, ties: Ties): Engine {
  const weights = model.milestones.map((milestone) => milestone.weight);
  const choices = model.preferences.map((preferences) =>
    compileChoice(model.technology, model.shock, preferences, weights),
  );
  const reference = compileReference(model.milestones, model.persistence, households, ties);
  return new CompiledEngine(model, households, ties, choices, reference);
}

/** Households that are solved alike. */
interface Task {
  readonly choice: Choice;
  /** Their numbers, ascending; null for everyone. */
  readonly members: Uint32Array | null;
}

class CompiledEngine implements Engine {
  readonly model: Model;
  readonly reference: Reference;
  readonly choices: readonly Choice[];
  private readonly households: Households;
  private readonly ties: Ties;
  private readonly tasks: readonly Task[];

  constructor(
    model: Model,
    households: Households,
    ties: Ties,
    choices: readonly Choice[],
    reference: Reference,
    tasks: readonly Task[] = tasksOf(choices, households),
  ) {
    this.model = model;
    this.households = households;
    this.ties = ties;
    this.choices = choices;
    this.reference = reference;
    this.tasks = tasks;
  }

  step(
    draws: Draws,
    t: number,
    generation: Generation,
    inherited: readonly Float64Array[] | null,
    aspirationFactor: Float64Array | null = null,
  ): void {
    const { wealth, aspirations, planned, met, investment, shock, isolated } = generation;
    this.reference.form(wealth, inherited, aspirations, isolated, aspirationFactor);
    const compiled = kernel();
    const [first] = this.tasks;
    const alike = this.tasks.length === 1 && first.members === null;
    if (
      alike &&
      compiled !== null &&
      (first.choice instanceof GrowthTableChoice || first.choice instanceof PlannedChoice)
    ) {
      stepByKernel(compiled, first.choice, this.model.shock, this.households, draws, t, generation);
      return;
    }
    this.choose(wealth, aspirations, planned, met, investment);
    drawShocks(this.model.shock, this.households, draws, t, shock);
    fillOutcome(generation);
  }

  resolveUnder(
    milestones: readonly Milestone[],
    generation: Generation,
    inherited: readonly Float64Array[] | null,
    aspirationFactor: Float64Array | null = null,
  ): Resolved {
    const n = this.households.n;
    const other = compileReference(milestones, this.model.persistence, this.households, this.ties);
    const aspirations = milestones.map(() => new Float64Array(n));
    const met = new Uint8Array(n);
    const planned = new Float64Array(n);
    other.form(generation.wealth, inherited, aspirations, new Uint8Array(n), aspirationFactor);
    this.choose(generation.wealth, aspirations, planned, met, null);
    return { met, planned, aspirations };
  }

  withTies(ties: Ties): Engine {
    const reference = this.reference.withTies(ties);
    return new CompiledEngine(this.model, this.households, ties, this.choices, reference, this.tasks);
  }

  private choose(
    wealth: Float64Array,
    aspirations: readonly Float64Array[],
    planned: Float64Array,
    met: Uint8Array,
    investment: Float64Array | null,
  ): void {
    const plans: Plans = { planned, met, investment };
    const { childWeight } = this.households;
    const compiled = kernel();
    for (const { choice, members } of this.tasks) {
      if (choice instanceof GrowthTableChoice) chooseByTable(choice, members, wealth, aspirations[0], plans);
      else if (choice instanceof PlannedChoice && compiled !== null) {
        chooseByKernel(compiled, choice, members, wealth, aspirations, childWeight, plans);
      } else chooseOneByOne(choice, members, wealth, aspirations, childWeight, plans);
    }
  }
}

/** Where plans are written; `investment` only when asked for. */
interface Plans {
  readonly planned: Float64Array;
  readonly met: Uint8Array;
  readonly investment: Float64Array | null;
}

/** Households by group; those whose child weight a group's table was not made for go to its exact solver. */
function tasksOf(choices: readonly Choice[], { n, group, childWeight }: Households): Task[] {
  const tasks: Task[] = [];
  choices.forEach((choice, g) => {
    const regular: number[] = [];
    const others: number[] = [];
    for (let i = 0; i < n; i++) {
      if (choices.length > 1 && group[i] !== g) continue;
      if (choice instanceof GrowthTableChoice && childWeight[i] !== choice.childWeight) others.push(i);
      else regular.push(i);
    }
    if (regular.length > 0) tasks.push({ choice, members: regular.length === n ? null : Uint32Array.from(regular) });
    if (others.length > 0 && choice instanceof GrowthTableChoice) {
      tasks.push({ choice: choice.exact, members: others.length === n ? null : Uint32Array.from(others) });
    }
  });
  return tasks;
}

function fillOutcome(generation: Generation): void {
  const { wealth, aspirations, investment, consumption, planned, shock, childWealth, reached } = generation;
  const n = wealth.length;
  const first = aspirations[0];
  for (let i = 0; i < n; i++) {
    consumption[i] = wealth[i] - investment[i];
    const outcome = planned[i] * shock[i];
    childWealth[i] = outcome;
    reached[i] = outcome >= first[i] ? 1 : 0;
  }
  for (let m = 1; m < aspirations.length; m++) {
    const aspiration = aspirations[m];
    for (let i = 0; i < n; i++) if (childWealth[i] >= aspiration[i]) reached[i]++;
  }
}

/**
 * Choice, shock and outcome of households that are all solved alike, a chunk at a time, so that every column is read and
 * written once: the same results as the three steps apart.
 */
function stepByKernel(
  compiled: Kernel,
  choice: GrowthTableChoice | PlannedChoice,
  shock: Shock,
  households: Households,
  draws: Draws,
  t: number,
  generation: Generation,
): void {
  const { wealth, aspirations, planned, met, investment, consumption, childWealth, reached } = generation;
  const n = wealth.length;
  const M = aspirations.length;
  const common = placeShocks(shock, households, draws, t);
  choice.prepare(compiled);
  for (let first = 0; first < n; first += CHUNK) {
    const count = Math.min(CHUNK, n - first);
    const end = first + count;
    compiled.wealth.set(wealth.subarray(first, end));
    for (let m = 0; m < M; m++) compiled.aspirations[m].set(aspirations[m].subarray(first, end));
    if (choice instanceof GrowthTableChoice) {
      const { cells, threshold, low, grossReturn } = choice;
      compiled.call.chooseByTable(count, cells, threshold, low, grossReturn);
    } else {
      compiled.childWeight.set(households.childWeight.subarray(first, end));
      compiled.call.choose(count);
    }
    shockChunk(compiled, shock, households, common, draws, t, first, count);
    compiled.call.outcome(count, M);
    copyOut(compiled.planned, planned, first, count);
    copyOut(compiled.investment, investment, first, count);
    copyOut(compiled.consumption, consumption, first, count);
    copyOut(compiled.draws, generation.shock, first, count);
    copyOut(compiled.childWealth, childWealth, first, count);
    met.set(count === CHUNK ? compiled.met : compiled.met.subarray(0, count), first);
    reached.set(count === CHUNK ? compiled.reached : compiled.reached.subarray(0, count), first);
  }
}

function copyOut(from: Float64Array, to: Float64Array, first: number, count: number): void {
  to.set(count === CHUNK ? from : from.subarray(0, count), first);
}

/** The loop of the one-milestone linear table with its fields in locals: the same results as `solve`, faster. */
function chooseByTable(
  choice: GrowthTableChoice,
  members: Uint32Array | null,
  wealth: Float64Array,
  aspiration: Float64Array,
  { planned, met, investment }: Plans,
): void {
  const { coefficients, cells, threshold, low, grossReturn } = choice;
  const count = members === null ? wealth.length : members.length;
  for (let e = 0; e < count; e++) {
    const i = members === null ? e : members[e];
    const y = wealth[i];
    const a = aspiration[i];
    const q = a / y;
    let z: number;
    if (q > threshold) {
      z = low * y;
      met[i] = 0;
    } else {
      z = growthAt(coefficients, cells, threshold, q > 0 ? q : 0) * y;
      // a tiny milestone weight puts the peak within rounding of the aspiration
      if (z < a) z = a;
      met[i] = 1;
    }
    planned[i] = z;
    if (investment !== null) investment[i] = z / grossReturn;
  }
}

/** Columns through the kernel, CHUNK households at a time. */
function chooseByKernel(
  compiled: Kernel,
  choice: PlannedChoice,
  members: Uint32Array | null,
  wealth: Float64Array,
  aspirations: readonly Float64Array[],
  childWeight: Float64Array,
  { planned, met, investment }: Plans,
): void {
  choice.prepare(compiled);
  const total = members === null ? wealth.length : members.length;
  for (let first = 0; first < total; first += CHUNK) {
    const count = Math.min(CHUNK, total - first);
    if (members === null) {
      const end = first + count;
      compiled.wealth.set(wealth.subarray(first, end));
      compiled.childWeight.set(childWeight.subarray(first, end));
      for (let m = 0; m < aspirations.length; m++) compiled.aspirations[m].set(aspirations[m].subarray(first, end));
      compiled.call.choose(count);
      planned.set(compiled.planned.subarray(0, count), first);
      met.set(compiled.met.subarray(0, count), first);
      if (investment !== null) investment.set(compiled.investment.subarray(0, count), first);
      continue;
    }
    for (let e = 0; e < count; e++) {
      const i = members[first + e];
      compiled.wealth[e] = wealth[i];
      compiled.childWeight[e] = childWeight[i];
      for (let m = 0; m < aspirations.length; m++) compiled.aspirations[m][e] = aspirations[m][i];
    }
    compiled.call.choose(count);
    for (let e = 0; e < count; e++) {
      const i = members[first + e];
      planned[i] = compiled.planned[e];
      met[i] = compiled.met[e];
      if (investment !== null) investment[i] = compiled.investment[e];
    }
  }
}

function chooseOneByOne(
  choice: Choice,
  members: Uint32Array | null,
  wealth: Float64Array,
  aspirations: readonly Float64Array[],
  childWeight: Float64Array,
  { planned, met, investment }: Plans,
): void {
  const own = new Float64Array(aspirations.length);
  const count = members === null ? wealth.length : members.length;
  for (let e = 0; e < count; e++) {
    const i = members === null ? e : members[e];
    for (let m = 0; m < own.length; m++) own[m] = aspirations[m][i];
    choice.solve(wealth[i], own, childWeight[i]);
    planned[i] = choice.planned;
    met[i] = choice.met;
    if (investment !== null) investment[i] = choice.investment;
  }
}
