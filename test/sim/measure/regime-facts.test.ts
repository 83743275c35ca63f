/**
 * Regimes on whole runs whose end is known (facts of the aspirations literature, *common practice*).
 */
import { describe, expect, test } from 'vitest';
import { densityModes } from '../../../sim/measure/modes.js';
import { quantileOfSorted } from '../../../sim/measure/quantile.js';
import { classifyRegime, PROFILE_AT, type RegimeObservation, type RegimeVerdict } from '../../../sim/measure/regime.js';
import { sampleOf } from '../../../sim/measure/sample.js';
import { variance } from '../../../sim/measure/spread.js';
import { runOne } from '../real-run.js';

const mean = (x: ArrayLike<number>): number => Array.from(x).reduce((a, b) => a + b, 0) / x.length;

async function regimeOf(
  technology: 'linear' | 'concave',
  start: { mean?: number; spread: number },
  generations: number,
  more: { shock?: number; scale?: number; weight?: number; households?: number } = {},
): Promise<RegimeVerdict> {
  const { shock = 0, scale = 1, weight = technology === 'linear' ? 0.6 : 1, households = 400 } = more;
  const economy =
    technology === 'linear'
      ? 'technology: {kind: linear, gross_return: 2.5}\npreferences: {curvature: 0.6, child_weight: 0.35}'
      : 'technology: {kind: concave, scale: 8, elasticity: 0.6}\npreferences: {curvature: 0.6, child_weight: 0.5}';
  const { generations: run, heirs } = await runOne(`study: Regimes
seed: regimes
generations: ${generations}
population: {households: ${households}, wealth: {shape: lognormal, mean: ${start.mean ?? 50}, sd_log: ${start.spread}}}
${economy}
shock: {sd_log: ${shock}}
reference: {milestones: [{weight: ${weight}, scale: ${scale}, mix: [{from: society, statistic: mean, weight: 1}]}]}
arms: [{name: all, network: {kind: random, mean_degree: 4}}]
`);
  const observe = (wealth: Float64Array, rest: Partial<RegimeObservation>): RegimeObservation => {
    const logs = sampleOf(wealth.map(Math.log));
    return {
      sdLog: Math.sqrt(variance(logs)),
      profile: PROFILE_AT.map((p) => quantileOfSorted(logs.value, p)),
      modes: densityModes(logs).length,
      shareFrustrated: NaN,
      meanGrowth: NaN,
      ...rest,
    };
  };
  return classifyRegime([
    ...run.map(({ wealth, childWealth, met }) =>
      observe(wealth, {
        shareFrustrated: mean(Array.from(met, (m) => (m === 0 ? 1 : 0))),
        meanGrowth: mean(childWealth) / mean(wealth),
      }),
    ),
    observe(heirs, {}),
  ]);
}

describe('linear technology, society-wide mean', () => {
  test('tight starts converge, wide ones widen', async () => {
    for (const generations of [12, 20, 40]) {
      expect((await regimeOf('linear', { spread: 0.05 }, generations)).regime).toBe('converging');
      expect((await regimeOf('linear', { spread: 0.7 }, generations)).regime).toBe('widening');
      expect((await regimeOf('linear', { spread: 1.5 }, generations)).regime).toBe('widening');
    }
  });

  test('everyone frustrated declines', async () => {
    const verdict = await regimeOf('linear', { spread: 0.15 }, 15, { scale: 3 });
    expect(verdict.regime).toBe('declining');
    expect(verdict.shareFrustrated).toBe(1);
    expect(verdict.meanGrowth).toBeLessThan(1);
  });
});

describe('concave technology, society-wide mean', () => {
  test('from near-equality it cycles, five generations to the round', async () => {
    for (const generations of [24, 60]) {
      expect(await regimeOf('concave', { spread: 1e-4 }, generations)).toMatchObject({ regime: 'cycling', period: 5 });
    }
  });

  test('a horizon too short to see the round leaves it undecided, and says how long would do', async () => {
    for (const generations of [8, 10, 13]) {
      const { regime, moreGenerations } = await regimeOf('concave', { spread: 1e-4 }, generations);
      expect(regime).toBe('undecided');
      expect((await regimeOf('concave', { spread: 1e-4 }, generations + moreGenerations)).regime).toBe('cycling');
    }
  });

  test('from wide starts it settles in two masses', async () => {
    const verdict = await regimeOf('concave', { spread: 1.6 }, 60);
    expect(verdict).toMatchObject({ regime: 'settled, two or more modes', modes: 2 });
  });

  test.each([0.15, 0.3])('shocks of %d settle in two modes', async (shock) => {
    for (const spread of [0.02, 1]) {
      const verdict = await regimeOf('concave', { spread }, 40, { shock, households: 2000 });
      expect(verdict.regime).toBe('settled, two or more modes');
      expect(verdict.modes).toBe(2);
      expect(verdict.shareFrustrated).toBeGreaterThan(0.25);
      expect(verdict.shareFrustrated).toBeLessThan(0.42);
    }
  });
});
