import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import type { Sample } from '../../../sim/estimate/fit.js';
import { logit } from '../../../sim/estimate/logit.js';
import { column, copy, dummies, grouping, luck, sample } from './samples.js';

function near(a: number, b: number, tolerance: number): void {
  expect(Math.abs(a - b), `${a} against ${b}`).toBeLessThanOrEqual(tolerance * Math.max(1, Math.abs(b)));
}

function simulated(seed: string, n = 600): Sample {
  const { normal, uniform } = luck(seed);
  const x = column('x', n, normal);
  const z = column('z', n, (i) => normal() + 0.5 * x.values[i]);
  const y = column('y', n, (i) => (uniform() < 1 / (1 + Math.exp(-(0.3 + x.values[i] - 0.5 * z.values[i]))) ? 1 : 0));
  return sample(y, [x, z]);
}

describe('logit', () => {
  test('absorbed effects equal typed-in dummies: coefficients, errors, marginal effects', () => {
    const base = simulated('effects');
    const place = grouping('place', 600, (i) => i % 15);
    const year = grouping('year', 600, (i) => Math.floor(i / 15) % 4);
    for (const more of [{ effects: [place] }, { effects: [place, year] }]) {
      for (const errors of ['classical', 'clustered'] as const) {
        const clusters = errors === 'clustered' ? [place] : [];
        const absorbed = logit({ ...copy(base), ...more, errors, clusters });
        const typed = logit({
          ...base,
          covariates: [...base.covariates, ...more.effects.flatMap(dummies)],
          errors,
          clusters,
        });
        // absorption to 1e-10 in every step
        for (const [j, term] of absorbed.terms.entries()) {
          near(term.estimate, typed.terms[j + 1].estimate, 1e-7);
          // clustered: effects nested in the cluster are not counted, typed-in dummies are
          if (errors === 'classical') near(term.std_error, typed.terms[j + 1].std_error, 1e-7);
          near(absorbed.marginal_effects?.[j].estimate ?? NaN, typed.marginal_effects?.[j].estimate ?? NaN, 1e-7);
        }
        near(absorbed.r_squared, typed.r_squared, 1e-9);
      }
    }
  });

  test('errors of the marginal effects: the delta method by numerical derivatives', () => {
    const base = simulated('delta');
    const fit = logit({ ...base, errors: 'robust' });
    const b = fit.terms.map((term) => term.estimate);
    const X = [column('one', 600, () => 1), ...base.covariates].map((x) => x.values);
    const effect = (beta: number[], j: number): number => {
      let sum = 0;
      for (let i = 0; i < 600; i++) {
        const p = 1 / (1 + Math.exp(-X.reduce((s, x, l) => s + beta[l] * x[i], 0)));
        sum += beta[j] * p * (1 - p);
      }
      return sum / 600;
    };
    for (const j of [1, 2]) {
      const h = 1e-5;
      const gradient = b.map((_, l) => {
        const at = (d: number) =>
          effect(
            b.map((v, m) => (m === l ? v + d : v)),
            j,
          );
        return (at(h) - at(-h)) / (2 * h);
      });
      let variance = 0;
      for (let a = 0; a < 3; a++)
        for (let c = 0; c < 3; c++) variance += gradient[a] * fit.covariance[a * 3 + c] * gradient[c];
      const marginal = fit.marginal_effects?.[j - 1];
      near(marginal?.estimate ?? NaN, effect(b, j), 1e-10);
      // central differences: h² of the third derivative
      near(marginal?.std_error ?? NaN, Math.sqrt(variance), 1e-7);
    }
  });

  test('groups without variation are dropped and counted', () => {
    const base = simulated('groups');
    const place = grouping('place', 600, (i) => (i < 5 ? 99 : i % 10));
    for (let i = 0; i < 5; i++) base.outcome.values[i] = 1;
    const fit = logit({ ...base, effects: [place] });
    expect(fit.nobs).toBe(595);
    expect(fit.notes[0]).toContain('1 group of place, in which y never varies, was dropped');
  });

  test('a rare but not impossible outcome is no separation', () => {
    const n = 2000;
    const d = column('d', n, (i) => (i < 40 ? 1 : 0));
    const y = column('y', n, (i) => (i < 39 || (i > 100 && i % 500 === 0) ? 1 : 0));
    const fit = logit(sample(y, [d]));
    // saturated: log odds ratios in closed form
    const ones = [39 / 1, 3 / 1957];
    near(fit.terms[0].estimate, Math.log(ones[1]), 1e-8);
    near(fit.terms[1].estimate, Math.log(ones[0]) - Math.log(ones[1]), 1e-8);
  });
});

describe('separation', () => {
  const n = 200;
  const { normal } = luck('separation');
  const x = column('x', n, normal);
  const noise = column('noise', n, normal);

  test('complete: a threshold in one term', () => {
    const y = column('y', n, (i) => (x.values[i] > 0.2 ? 1 : 0));
    expect(() => logit(sample(y, [x, noise]))).toThrow(/x.* the outcome y without error/);
  });

  test('quasi-complete: a dummy that decides its rows, named alone', () => {
    const { uniform } = luck('quasi');
    const d = column('isolated', n, (i) => (i % 10 === 0 ? 1 : 0));
    const y = column('y', n, (i) => (d.values[i] === 1 || uniform() < 1 / (1 + Math.exp(-x.values[i])) ? 1 : 0));
    expect(() => logit(sample(y, [x, d, noise]))).toThrow(
      /isolated predicts the outcome y without error in 20 of 200 rows, so that no finite/,
    );
  });

  test('a combination of terms', () => {
    const y = column('y', n, (i) => (x.values[i] + noise.values[i] > 0 ? 1 : 0));
    expect(() => logit(sample(y, [x, noise]))).toThrow(/x, noise predict the outcome/);
  });

  test('two dummies and a table of counts: separated exactly when an empty cell says so, else the closed form', () => {
    const count = fc.integer({ min: 0, max: 6 });
    fc.assert(
      fc.property(fc.tuple(count, count, count, count), ([a, b, c, d]) => {
        // rows of (x, y): a of (0,0), b of (0,1), c of (1,0), d of (1,1)
        fc.pre(a + b > 0 && c + d > 0 && a + c > 0 && b + d > 0 && a + b + c + d > 2);
        const cells = [a, b, c, d].flatMap((times, cell) => new Array<number>(times).fill(cell));
        const x = column('x', cells.length, (i) => cells[i] >> 1);
        const y = column('y', cells.length, (i) => cells[i] & 1);
        if (a * b * c * d === 0) expect(() => logit(sample(y, [x]))).toThrow(/x predicts the outcome y without error/);
        else {
          const fit = logit(sample(y, [x]));
          near(fit.terms[1].estimate, Math.log((a * d) / (b * c)), 1e-8);
          near(fit.terms[1].std_error, Math.sqrt(1 / a + 1 / b + 1 / c + 1 / d), 1e-8);
        }
      }),
    );
  });

  test('an outcome that is not 0 or 1 is refused', () => {
    expect(() =>
      logit(
        sample(
          column('y', n, (i) => i % 3),
          [x],
        ),
      ),
    ).toThrow(/is 2 in some row/);
  });
});
