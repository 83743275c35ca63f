import { inverse, Matrix, solve } from 'ml-matrix';
import { describe, expect, test } from 'vitest';
import type { Sample } from '../../../sim/estimate/fit.js';
import { iv } from '../../../sim/estimate/iv.js';
import { ols } from '../../../sim/estimate/ols.js';
import { column, copy, dummies, grouping, luck, sample } from './samples.js';

// two routes to the same numbers in double precision, on well-conditioned data: rounding only
const ROUNDING = 1e-9;
const ABSORBED = 1e-7;

function near(a: number, b: number, tolerance: number): void {
  expect(Math.abs(a - b), `${a} against ${b}`).toBeLessThanOrEqual(tolerance * Math.max(1, Math.abs(b)));
}

function simulated(
  seed: string,
  strength: number,
  n = 300,
  q = 2,
): Sample & { endogenous: NonNullable<Sample['endogenous']> } {
  const { normal } = luck(seed);
  const Z = Array.from({ length: q }, (_, j) => column(`z${j}`, n, normal));
  const w = column('w', n, normal);
  const u = Float64Array.from({ length: n }, normal);
  const x = column(
    'x',
    n,
    (i) => 0.7 * u[i] + 0.7 * normal() + w.values[i] + Z.reduce((s, z) => s + strength * z.values[i], 0),
  );
  const y = column('y', n, (i) => x.values[i] - w.values[i] + u[i]);
  return { ...sample(y, [w]), endogenous: [x], instruments: Z };
}

describe('two-stage least squares', () => {
  test('instruments that are the regressors themselves give least squares, under every kind of errors', () => {
    const base = simulated('self', 1);
    const x = base.endogenous[0];
    const same = { name: 'copy', values: x.values };
    const place = grouping('place', 300, (i) => i % 30);
    for (const errors of ['classical', 'robust', 'robust-hc3', 'clustered'] as const) {
      const more = { errors, clusters: errors === 'clustered' ? [place] : [] };
      const two = iv({ ...base, instruments: [same], ...more });
      const one = ols(sample(base.outcome, [x, ...base.covariates], more));
      for (const [j, term] of two.terms.entries()) {
        expect(term.term).toBe(one.terms[j].term);
        near(term.estimate, one.terms[j].estimate, ROUNDING);
        near(term.std_error, one.terms[j].std_error, ROUNDING);
      }
    }
  });

  test('absorbed effects equal typed-in dummies, diagnostics too', () => {
    const base = simulated('effects', 0.5);
    const place = grouping('place', 300, (i) => i % 12);
    const year = grouping('year', 300, (i) => Math.floor(i / 12) % 7);
    for (const errors of ['classical', 'robust'] as const) {
      const absorbed = iv(copy({ ...base, effects: [place, year], errors }));
      const typed = iv({ ...base, covariates: [...base.covariates, ...dummies(place), ...dummies(year)], errors });
      const find = (name: string) => typed.terms.find((term) => term.term === name);
      for (const term of absorbed.terms) {
        near(term.estimate, find(term.term)?.estimate ?? NaN, ABSORBED);
        near(term.std_error, find(term.term)?.std_error ?? NaN, ABSORBED);
      }
      const [a, b] = [absorbed.diagnostics, typed.diagnostics];
      near(a.first_stage_F?.F ?? NaN, b.first_stage_F?.F ?? NaN, ABSORBED);
      near(a.wu_hausman?.F ?? NaN, b.wu_hausman?.F ?? NaN, ABSORBED);
      near(a.effective_F?.F ?? NaN, b.effective_F?.F ?? NaN, ABSORBED);
      near(a.anderson_rubin?.zero.F ?? NaN, b.anderson_rubin?.zero.F ?? NaN, ABSORBED);
      if (errors === 'classical') near(a.sargan?.stat ?? NaN, b.sargan?.stat ?? NaN, ABSORBED);
      else near(a.hansen_j?.stat ?? NaN, b.hansen_j?.stat ?? NaN, 1e-6);
    }
  });

  test('the Anderson–Rubin test of zero is the F test of the instruments in the reduced form', () => {
    const base = simulated('reduced', 0.5);
    const fit = iv(base);
    const full = ols(sample(base.outcome, [...base.covariates, ...(base.instruments ?? [])]));
    const less = ols(sample(base.outcome, base.covariates));
    const rss = (f: typeof full) => f.diagnostics.fit?.['rss'] as number;
    const F = (rss(less) - rss(full)) / 2 / (rss(full) / full.df_resid);
    near(fit.diagnostics.anderson_rubin?.zero.F ?? NaN, F, ROUNDING);
  });

  test('with one strong instrument the Anderson–Rubin interval holds the estimate, and its ends are at p = 5 %', () => {
    const base = simulated('ends', 1, 300, 1);
    for (const errors of ['classical', 'robust'] as const) {
      const fit = iv({ ...base, errors });
      const set = fit.diagnostics.anderson_rubin;
      expect(set?.kind).toBe('interval');
      const [low, high] = (set?.intervals[0] ?? []) as [number, number];
      const at = fit.terms[1].estimate;
      expect(low < at && at < high).toBe(true);
      // the test at an end: y − end·x regressed on the instrument, whose F is the critical value
      for (const end of [low, high]) {
        const moved = column('moved', 300, (i) => base.outcome.values[i] - end * base.endogenous[0].values[i]);
        const reduced = ols(sample(moved, [...base.covariates, ...(base.instruments ?? [])], { errors }));
        const z = reduced.terms[reduced.terms.length - 1];
        // bisection to 1e-12 in the angle
        near(z.p_value, 0.05, 1e-6);
      }
    }
  });

  test('just identified, the effective F is the squared t of the instrument in the first stage', () => {
    const base = simulated('effective', 0.3, 300, 1);
    const place = grouping('place', 300, (i) => i % 40);
    const more = { errors: 'clustered', clusters: [place] } as const;
    const fit = iv({ ...base, ...more });
    const first = ols(sample(base.endogenous[0], [...base.covariates, ...(base.instruments ?? [])], more));
    near(fit.diagnostics.effective_F?.F ?? NaN, first.terms[2].statistic ** 2, ROUNDING);
    // one degree of freedom: (√10 + 1.645)² = 23.1 (Montiel Olea and Pflueger 2013)
    near(fit.diagnostics.effective_F?.critical ?? NaN, 23.1085, 1e-4);
  });

  test('useless instruments: a warning in words and an unbounded set', () => {
    const fit = iv({ ...simulated('weak', 0.01), errors: 'robust' });
    expect(fit.notes.join(' ')).toContain('Weak instruments');
    expect(fit.diagnostics.anderson_rubin?.kind).not.toBe('interval');
    expect(fit.diagnostics.anderson_rubin?.intervals.some(([low, high]) => low === null || high === null)).toBe(true);
  });

  test('two instrumented terms: F tests each, Cragg–Donald, no interval', () => {
    const base = simulated('two', 1, 300, 3);
    const { normal } = luck('second');
    const second = column('x2', 300, (i) => (base.instruments?.[2].values[i] ?? 0) + normal());
    const fit = iv({ ...base, endogenous: [...base.endogenous, second] });
    expect(fit.terms.map((term) => term.term)).toEqual(['(const)', 'x', 'x2', 'w']);
    const d = fit.diagnostics as Record<string, unknown>;
    expect((d['first_stage_F1'] as { F: number }).F).toBeGreaterThan(0);
    expect((d['first_stage_F2'] as { F: number }).F).toBeGreaterThan(0);
    expect(fit.diagnostics.cragg_donald?.F).toBeLessThan(
      Math.min((d['first_stage_F1'] as { F: number }).F, (d['first_stage_F2'] as { F: number }).F),
    );
    expect(fit.diagnostics.anderson_rubin).toBeUndefined();
    expect(fit.diagnostics.anderson_rubin_zero?.df1).toBe(3);
  });

  test('too few instruments, and instruments that move nothing, are refused', () => {
    const base = simulated('few', 1, 300, 1);
    const { normal } = luck('other');
    const second = column('x2', 300, normal);
    expect(() => iv({ ...base, endogenous: [...base.endogenous, second] })).toThrow(
      /2 instrumented terms but only 1 usable/,
    );
    expect(() => iv({ ...base, instruments: [{ name: 'again', values: base.covariates[0].values }] })).toThrow(
      /is collinear/,
    );
    // an instrument exactly orthogonal to the regressor
    const n = 8;
    const z = column('z', n, (i) => (i % 2 ? 1 : -1));
    const x = column('x', n, (i) => (i % 4 < 2 ? 1 : -1));
    const y = column('y', n, (i) => i);
    expect(() => iv({ ...sample(y, []), endogenous: [x], instruments: [z] })).toThrow(/do not move x/);
  });
});

describe('robust and clustered diagnostics against dense formulas', () => {
  const base = simulated('dense', 0.3, 120, 3);
  const place = grouping('place', 120, (i) => i % 24);
  const n = 120;
  const q = 3;
  const y = Matrix.columnVector(base.outcome.values);
  const x = Matrix.columnVector(base.endogenous[0].values);
  const one = Matrix.ones(n, 1);
  const W = hstack(one, Matrix.columnVector(base.covariates[0].values));
  const Z = hstack(...(base.instruments ?? []).map((z) => Matrix.columnVector(z.values)));
  const residual = (v: Matrix, on: Matrix): Matrix => Matrix.sub(v, on.mmul(solve(on, v)));
  const yt = residual(y, W);
  const xt = residual(x, W);
  const Zt = residual(Z, W);

  /** Σ over clusters (or rows) of the outer product of summed scores. */
  const meat = (scores: Matrix, clustered: boolean): Matrix => {
    const G = clustered ? 24 : n;
    const sums = Matrix.zeros(G, scores.columns);
    for (let i = 0; i < n; i++) {
      for (let c = 0; c < scores.columns; c++) sums.set(i % G, c, sums.get(i % G, c) + scores.get(i, c));
    }
    return sums.transpose().mmul(sums);
  };
  const rowsTimes = (M: Matrix, v: Matrix): Matrix => {
    const out = M.clone();
    for (let i = 0; i < n; i++) out.mulRow(i, v.get(i, 0));
    return out;
  };
  const form = (A: Matrix, v: Matrix): number => v.transpose().mmul(inverse(A)).mmul(v).get(0, 0);

  test.each([false, true])('Hansen J, effective F and Anderson–Rubin, clustered %s', (clustered) => {
    const fit = iv({ ...base, errors: clustered ? 'clustered' : 'robust', clusters: clustered ? [place] : [] });
    const k = 2 + q;
    const factor = clustered ? (24 / 23) * ((n - 1) / (n - k)) : n / (n - k);

    // two-step efficient estimate on the instruments as they are
    const A = hstack(W, Z);
    const X = hstack(W, x);
    const P = A.mmul(inverse(A.transpose().mmul(A))).mmul(A.transpose());
    const Xh = P.mmul(X);
    const b = inverse(Xh.transpose().mmul(X)).mmul(Xh.transpose().mmul(y));
    const u = Matrix.sub(y, X.mmul(b));
    const S = inverse(meat(rowsTimes(A, u), clustered));
    const AX = A.transpose().mmul(X);
    const b2 = inverse(AX.transpose().mmul(S).mmul(AX)).mmul(AX.transpose().mmul(S).mmul(A.transpose().mmul(y)));
    const g = A.transpose().mmul(Matrix.sub(y, X.mmul(b2)));
    near(fit.diagnostics.hansen_j?.stat ?? NaN, g.transpose().mmul(S).mmul(g).get(0, 0), 1e-8);
    expect(fit.diagnostics.hansen_j?.df).toBe(q - 1);

    // x̃'P x̃ over the trace of W₂ in the metric of the instruments
    const v = residual(xt, Zt);
    const ZZ = Zt.transpose().mmul(Zt);
    const omega = Matrix.mul(meat(rowsTimes(Zt, v), clustered), factor);
    const signal = form(ZZ, Zt.transpose().mmul(xt));
    const F = signal / inverse(ZZ).mmul(omega).trace();
    near(fit.diagnostics.effective_F?.F ?? NaN, F, 1e-8);

    // Wald test of the instruments in a regression of y on them
    const e = residual(yt, Zt);
    const omegaY = Matrix.mul(meat(rowsTimes(Zt, e), clustered), factor);
    near(fit.diagnostics.anderson_rubin?.zero.F ?? NaN, form(omegaY, Zt.transpose().mmul(yt)) / q, 1e-8);
    expect(fit.diagnostics.anderson_rubin?.zero.df2).toBe(clustered ? 23 : n - k);
  });
});

function hstack(...parts: Matrix[]): Matrix {
  const out = Matrix.zeros(
    parts[0].rows,
    parts.reduce((sum, part) => sum + part.columns, 0),
  );
  let at = 0;
  for (const part of parts) {
    out.setSubMatrix(part, 0, at);
    at += part.columns;
  }
  return out;
}
