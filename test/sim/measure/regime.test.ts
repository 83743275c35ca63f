import { describe, expect, test } from 'vitest';
import { classifyRegime, type RegimeObservation } from '../../../sim/measure/regime.js';
import { stream } from '../../../sim/random/stream.js';

/** A lognormal shape with this median and spread of log wealth. */
function shape(level: number, sdLog: number, more: Partial<RegimeObservation> = {}): RegimeObservation {
  return {
    sdLog,
    profile: Array.from({ length: 19 }, (_, k) => level + sdLog * (3.3 * ((k + 1) / 20) - 1.65)),
    modes: 1,
    shareFrustrated: 0.3,
    meanGrowth: 1.2,
    ...more,
  };
}

const series = (T: number, of: (t: number) => RegimeObservation): RegimeObservation[] =>
  Array.from({ length: T + 1 }, (_, t) => of(t));

describe('regimes', () => {
  test('a spread that shrinks at a steady rate converges, however slowly it started', () => {
    expect(classifyRegime(series(20, (t) => shape(0.2 * t, 0.8 * 0.9 ** t))).regime).toBe('converging');
    expect(classifyRegime(series(20, (t) => shape(0.2 * t, 0.8 * 0.2 ** t))).regime).toBe('converging');
    expect(classifyRegime(series(12, (t) => shape(0, 0.4 * 0.97 ** t))).regime).toBe('converging');
  });

  test('a spread that keeps growing widens', () => {
    expect(classifyRegime(series(20, (t) => shape(0.1 * t, 0.3 + 0.05 * t))).regime).toBe('widening');
    expect(classifyRegime(series(10, (t) => shape(0.1 * t, 0.3 * 1.1 ** t))).regime).toBe('widening');
  });

  test('stable distributions are told apart by their modes', () => {
    expect(classifyRegime(series(15, () => shape(4, 0.5))).regime).toBe('settled, one mode');
    const two = classifyRegime(series(15, () => shape(4, 0.5, { modes: 2 })));
    expect(two.regime).toBe('settled, two or more modes');
    expect(two).toMatchObject({ modes: 2, from: 10, to: 15, sdLogTo: 0.5 });
    expect(classifyRegime(series(15, () => shape(4, 0.7, { modes: 3 }))).modes).toBe(3);
  });

  test('a stable spread around a level that grows has settled, and no more is said', () => {
    expect(classifyRegime(series(15, (t) => shape(0.3 * t, 0.5))).regime).toBe('settled');
  });

  test('luck in a stable spread is not taken for movement', () => {
    let settled = 0;
    for (let r = 0; r < 100; r++) {
      const draw = stream('luck', r, 'test');
      const observed = series(15, () => shape(4 + 0.02 * (draw() - 0.5), 0.5 * (1 + 0.04 * (draw() - 0.5))));
      if (classifyRegime(observed).regime === 'settled, one mode') settled++;
    }
    // ± 2 % a generation over six generations
    expect(settled).toBeGreaterThanOrEqual(95);
  });

  test('everyone frustrated and growth below 1 for ever is decline', () => {
    const falling = { shareFrustrated: 1, meanGrowth: 0.9 };
    expect(classifyRegime(series(12, (t) => shape(-0.1 * t, 0.4, falling))).regime).toBe('declining');
    // on the way to a standstill: the shortfall from 1 shrinks
    const braking = classifyRegime(
      series(24, (t) => shape(-0.3 * (1 - 0.6 ** t), 0.4, { shareFrustrated: 1, meanGrowth: 1 - 0.2 * 0.6 ** t })),
    );
    expect(braking.regime).toBe('settled, one mode');
  });

  test('a distribution that returns to itself cycles, with its period', () => {
    // the trial of the model's notes: mean wealth 46, 60, 73, 84, 93 and again
    const levels = [46, 60, 73, 84, 93].map(Math.log);
    const cycle = classifyRegime(
      series(30, (t) => shape(levels[t % 5], 1e-5, { shareFrustrated: t % 5 === 4 ? 1 : 0 })),
    );
    expect(cycle.regime).toBe('cycling');
    expect(cycle.period).toBe(5);
    expect(cycle.distance).toBeLessThan(1e-9);
    expect(classifyRegime(series(15, (t) => shape(t % 2, 0.4))).period).toBe(2);
    // steady growth returns to nothing
    expect(classifyRegime(series(30, (t) => shape(0.2 * t, 1e-5))).regime).toBe('converging');
  });

  test('movements that die down leave it undecided, and say how long to wait', () => {
    // toward 0.8 from below and toward 0.3 from above, the gap shrinking by a quarter a generation
    const rises = (t: number): RegimeObservation => shape(4, 0.8 - 0.6 * 0.75 ** t);
    const falls = (t: number): RegimeObservation => shape(4, 0.3 + 0.6 * 0.75 ** t);
    for (const of of [rises, falls]) {
      const verdict = classifyRegime(series(9, of));
      expect(verdict.regime).toBe('undecided');
      expect(verdict.moreGenerations).toBeGreaterThan(2);
      expect(verdict.moreGenerations).toBeLessThan(30);
      // waiting as long as said is enough
      expect(classifyRegime(series(9 + verdict.moreGenerations, of)).regime).toBe('settled, one mode');
    }
  });

  test('too short a horizon is undecided', () => {
    const verdict = classifyRegime(series(2, () => shape(4, 0.5)));
    expect(verdict).toMatchObject({ regime: 'undecided', moreGenerations: 1 });
  });
});
