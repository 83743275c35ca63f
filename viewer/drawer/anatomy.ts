/**
 * One household's decision, taken apart with the engine's own objective: the curve, its peaks, the choice, what
 * would change it. Computes only; nothing is drawn here.
 */
import { type Choice, compileChoice, type Peak } from '../../sim/model/choice.js';
import type { Model } from '../../sim/model/types.js';
import type { Decision } from '../../sim/results/figures/decision.js';

/** What the engine is asked about one household. */
export interface Problem {
  readonly model: Model;
  readonly group: number;
  readonly wealth: number;
  readonly aspirations: readonly number[];
  readonly childWeight: number;
}

const compiled = new WeakMap<Model, (Choice | undefined)[]>();

/** The engine's solver for the household's group, kept by model. */
export function solver(model: Model, group: number): Choice {
  let list = compiled.get(model);
  if (list === undefined) compiled.set(model, (list = []));
  let choice = list[group];
  if (choice === undefined) {
    choice = compileChoice(
      model.technology,
      model.shock,
      model.preferences[group],
      model.milestones.map((m) => m.weight),
    );
    list[group] = choice;
  }
  return choice;
}

/** Largest child wealth that can be planned: everything invested. */
export function mostPlanned(model: Model, wealth: number): number {
  const t = model.technology;
  return t.kind === 'linear'
    ? t.grossReturn * wealth
    : t.scale * wealth ** t.elasticity + (1 - t.depreciation) * wealth;
}

/** The choice: the best peak, the higher plan in a tie. */
export function decide(p: Problem): { readonly planned: number; readonly met: number } {
  const choice = solver(p.model, p.group);
  choice.solve(p.wealth, p.aspirations, p.childWeight);
  return { planned: choice.planned, met: choice.met };
}

/** The decision to draw. Cost some 300 evaluations of the objective. */
export function anatomy(p: Problem): Decision {
  const choice = solver(p.model, p.group);
  const peaks: Peak[] = choice.candidates(p.wealth, p.aspirations, p.childWeight);
  const most = mostPlanned(p.model, p.wealth);
  const lowest = Math.min(...peaks.map((q) => q.z), ...p.aspirations, most);
  const from = Math.max(0.03 * most, 0.45 * lowest);
  const points: number[] = [];
  const count = 220;
  for (let k = 0; k <= count; k++) points.push(from + ((most - from) * k) / count);
  // just above a milestone the slope is without bound: look there more closely
  for (const a of p.aspirations) {
    for (let k = 0; k < 24; k++) {
      const z = a + (most - a) * 1e-5 * 2 ** (0.6 * k);
      if (z > from && z < most) points.push(z);
    }
    if (a > from && a < most) points.push(a);
  }
  points.push(...peaks.map((q) => q.z).filter((z) => z > from && z < most));
  points.sort((a, b) => a - b);
  const utility = points.map((z) => choice.objective(p.wealth, z, p.aspirations, p.childWeight));
  let chosen = 0;
  peaks.forEach((q, k) => {
    if (q.utility >= peaks[chosen].utility) chosen = k;
  });
  return {
    planned: points,
    utility,
    peaks: peaks.map((q) => ({ planned: q.z, utility: q.utility, met: q.met })),
    chosen,
    aspirations: p.aspirations,
  };
}

/**
 * Wealth at which this household would just reach for a milestone, its aspirations staying where they are: by
 * bisection on the engine's own decision.
 *
 * @returns NaN when it meets one already, or would not even at 50 times its wealth
 */
export function wealthThatWouldDo(p: Problem): number {
  if (decide(p).met > 0) return NaN;
  let low = p.wealth;
  let high = p.wealth;
  for (let k = 0; k < 12; k++) {
    high *= 1.4;
    if (decide({ ...p, wealth: high }).met > 0) break;
    low = high;
    if (k === 11) return NaN;
  }
  for (let k = 0; k < 40; k++) {
    const middle = (low + high) / 2;
    if (decide({ ...p, wealth: middle }).met > 0) high = middle;
    else low = middle;
  }
  return high;
}

/** The mix of a milestone in words: `0.8 richer neighbours + 0.1 itself + 0.1 everyone`. */
export function mixInWords(model: Model, milestone: number): string {
  const { mix, scale } = model.milestones[milestone];
  const from: Record<string, string> = {
    self: 'itself',
    neighbours: 'neighbours',
    second_circle: 'neighbours of neighbours',
    group: 'its group',
    place: 'its place',
    society: 'everyone',
  };
  const parts = mix
    .filter((part) => part.weight > 0)
    .map((part) => {
      const who = from[part.from];
      const said =
        part.from === 'self'
          ? who
          : part.statistic === 'upward_mean'
            ? `richer of ${who}`
            : part.statistic === 'mean'
              ? who
              : part.statistic === 'quantile'
                ? `${who} (quantile ${part.q})`
                : part.statistic === 'similarity_mean'
                  ? `${who} like it`
                  : `${part.statistic} of ${who}`;
      return `${part.weight === 1 ? '' : `${Number(part.weight.toFixed(2))} `}${part.from === 'neighbours' && part.statistic === 'upward_mean' ? 'richer neighbours' : said}`;
    });
  return `${scale === 1 ? '' : `${Number(scale.toFixed(2))} × (`}${parts.join(' + ')}${scale === 1 ? '' : ')'}`;
}
