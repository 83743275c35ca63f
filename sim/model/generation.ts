/**
 * One generation of every household: aspirations, choice, shock, outcome, in columns made once and reused.
 *
 * The caller owns time: it fills `wealth`, applies changes, steps, records, and carries child wealth over.
 */
import type { Ties } from '../../network/graph.js';
import type { Draws } from '../random/draws.js';
import { type Choice, compileChoice } from './choice.js';
import { GrowthTableChoice, growthAt } from './growth-table.js';
import { compileReference, type Reference } from './reference.js';
import { drawShocks } from './shock.js';
import type { Generation, Households, Milestone, Model, Part } from './types.js';

/** Columns for n households: 57 + 8·milestones bytes a household. */
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

class CompiledEngine implements Engine {
  readonly model: Model;
  readonly reference: Reference;
  readonly choices: readonly Choice[];
  private readonly households: Households;
  private readonly ties: Ties;
  private readonly own: Float64Array;

  constructor(model: Model, households: Households, ties: Ties, choices: readonly Choice[], reference: Reference) {
    this.model = model;
    this.households = households;
    this.ties = ties;
    this.choices = choices;
    this.reference = reference;
    this.own = new Float64Array(model.milestones.length);
  }

  step(
    draws: Draws,
    t: number,
    generation: Generation,
    inherited: readonly Float64Array[] | null,
    aspirationFactor: Float64Array | null = null,
  ): void {
    const { wealth, aspirations, investment, consumption, planned, shock, childWealth, met, reached, isolated } =
      generation;
    this.reference.form(wealth, inherited, aspirations, isolated, aspirationFactor);
    this.choose(wealth, aspirations, planned, met, investment);
    drawShocks(this.model.shock, this.households, draws, t, shock);
    const n = wealth.length;
    for (let i = 0; i < n; i++) {
      consumption[i] = wealth[i] - investment[i];
      childWealth[i] = planned[i] * shock[i];
    }
    const first = aspirations[0];
    for (let i = 0; i < n; i++) reached[i] = childWealth[i] >= first[i] ? 1 : 0;
    for (let m = 1; m < aspirations.length; m++) {
      const aspiration = aspirations[m];
      for (let i = 0; i < n; i++) if (childWealth[i] >= aspiration[i]) reached[i]++;
    }
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
    return new CompiledEngine(this.model, this.households, ties, this.choices, this.reference.withTies(ties));
  }

  private choose(
    wealth: Float64Array,
    aspirations: readonly Float64Array[],
    planned: Float64Array,
    met: Uint8Array,
    investment: Float64Array | null,
  ): void {
    const { group, childWeight } = this.households;
    const { choices, own } = this;
    const n = wealth.length;
    const M = aspirations.length;
    const only = choices.length === 1 ? choices[0] : null;
    if (only instanceof GrowthTableChoice) {
      chooseByTable(only, wealth, aspirations[0], childWeight, own, planned, met, investment);
      return;
    }
    for (let i = 0; i < n; i++) {
      const choice = only ?? choices[group[i]];
      for (let m = 0; m < M; m++) own[m] = aspirations[m][i];
      choice.solve(wealth[i], own, childWeight[i]);
      planned[i] = choice.planned;
      met[i] = choice.met;
      if (investment !== null) investment[i] = choice.investment;
    }
  }
}

/** The loop of the one-milestone linear table with its fields in locals: the same results as `solve`, faster. */
function chooseByTable(
  choice: GrowthTableChoice,
  wealth: Float64Array,
  aspiration: Float64Array,
  childWeight: Float64Array,
  own: Float64Array,
  planned: Float64Array,
  met: Uint8Array,
  investment: Float64Array | null,
): void {
  const { coefficients, cells, threshold, low, grossReturn } = choice;
  const tabulated = choice.childWeight;
  const n = wealth.length;
  for (let i = 0; i < n; i++) {
    const y = wealth[i];
    if (childWeight[i] !== tabulated) {
      own[0] = aspiration[i];
      choice.solve(y, own, childWeight[i]);
      planned[i] = choice.planned;
      met[i] = choice.met;
      if (investment !== null) investment[i] = choice.investment;
      continue;
    }
    const q = aspiration[i] / y;
    let z: number;
    if (q > threshold) {
      z = low * y;
      met[i] = 0;
    } else {
      z = growthAt(coefficients, cells, threshold, Math.max(q, 0)) * y;
      met[i] = 1;
    }
    planned[i] = z;
    if (investment !== null) investment[i] = z / grossReturn;
  }
}
