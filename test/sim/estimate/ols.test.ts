import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { cells, effectsRank, groupsOf, nestedIn, withoutSingletons } from '../../../sim/estimate/groups.js';
import { ols } from '../../../sim/estimate/ols.js';
import { column, copy, dummies, grouping, luck, sample } from './samples.js';

// two algorithms for the same numbers in double precision, on well-conditioned data: rounding only
const ROUNDING = 1e-9;
// absorption stops at 1e-10 of a column's length; coefficients inherit a small multiple of it
const ABSORBED = 1e-8;

function near(a: number, b: number, tolerance: number): void {
  expect(Math.abs(a - b), `${a} against ${b}`).toBeLessThanOrEqual(tolerance * Math.max(1, Math.abs(b)));
}

function panel(seed: string, n = 400, places = 17, years = 9) {
  const { normal, below } = luck(seed);
  const place = grouping('place', n, () => below(places));
  const year = grouping('year', n, () => below(years));
  const a = Float64Array.from({ length: places }, normal);
  const x = column('x', n, (i) => normal() + a[place.codes[i]]);
  const z = column('z', n, (i) => normal() + 0.1 * year.codes[i]);
  const y = column('y', n, (i) => 1 + 2 * x.values[i] - z.values[i] + 3 * a[place.codes[i]] + normal());
  return { n, place, year, x, z, y };
}

describe('absorbed effects', () => {
  test.each(['a', 'b', 'c'])('equal typed-in dummies: coefficients, classical, HC1 and HC3 errors (%s)', (seed) => {
    const { x, z, y, place, year } = panel(seed);
    for (const errors of ['classical', 'robust'] as const) {
      const absorbed = ols(copy(sample(y, [x, z], { effects: [place, year], errors })));
      const typed = ols(sample(y, [x, z, ...dummies(place), ...dummies(year)], { errors }));
      for (const [j, term] of absorbed.terms.entries()) {
        near(term.estimate, typed.terms[j + 1].estimate, ABSORBED);
        near(term.std_error, typed.terms[j + 1].std_error, ABSORBED);
        near(term.p_value, typed.terms[j + 1].p_value, ABSORBED);
      }
      near(absorbed.r_squared, typed.r_squared, ABSORBED);
      expect(absorbed.df_resid).toBe(typed.df_resid);
    }
    const absorbed = ols(copy(sample(y, [x, z], { effects: [place], errors: 'robust-hc3' })));
    const typed = ols(sample(y, [x, z, ...dummies(place)], { errors: 'robust-hc3' }));
    near(absorbed.terms[0].std_error, typed.terms[1].std_error, ROUNDING);
  });

  test('three effects equal their dummies', () => {
    const { x, z, y, place, year, n } = panel('three');
    const third = grouping('third', n, (i) => (i * 7) % 5);
    const absorbed = ols(copy(sample(y, [x, z], { effects: [place, year, third] })));
    const typed = ols(sample(y, [x, z, ...dummies(place), ...dummies(year), ...dummies(third)]));
    near(absorbed.terms[0].estimate, typed.terms[1].estimate, ABSORBED);
    near(absorbed.terms[1].std_error, typed.terms[2].std_error, ABSORBED);
  });

  test('a poorly connected pair of effects still settles', () => {
    // a chain: each place shares one year with the next, so information travels slowly
    const n = 600;
    const { normal } = luck('chain');
    const place = grouping('place', n, (i) => Math.floor(i / 6));
    const year = grouping('year', n, (i) => Math.floor((i + 3) / 6));
    const x = column('x', n, normal);
    const y = column('y', n, (i) => x.values[i] + normal());
    const absorbed = ols(copy(sample(y, [x], { effects: [place, year] })));
    const typed = ols(sample(y, [x, ...dummies(place), ...dummies(year)]));
    near(absorbed.terms[0].estimate, typed.terms[1].estimate, ABSORBED);
    expect(absorbed.notes).toEqual([]);
  });

  test('a covariate that only varies between groups is dropped and named', () => {
    const { x, y, place, n } = panel('between');
    const fixed = column('fixed', n, (i) => place.codes[i] * 10 + 1000);
    const fit = ols(copy(sample(y, [fixed, x], { effects: [place] })));
    expect(fit.dropped).toEqual([{ term: 'fixed', why: 'does not vary within the absorbed effects' }]);
    expect(fit.terms.map((term) => term.term)).toEqual(['x']);
  });
});

describe('collinear columns', () => {
  test('the one named later goes', () => {
    const { x, z, y, n } = panel('collinear');
    const sum = column('sum', n, (i) => x.values[i] + z.values[i]);
    const flat = column('flat', n, () => 3);
    const fit = ols(sample(y, [flat, x, z, sum]));
    expect(fit.terms.map((term) => term.term)).toEqual(['(const)', 'x', 'z']);
    expect(fit.dropped.map((d) => d.term)).toEqual(['flat', 'sum']);
    expect(fit.dropped[1].why).toBe('is collinear with the terms before it');
  });

  test('nearly collinear columns above the threshold stay', () => {
    const { x, y, n } = panel('nearly');
    const { normal } = luck('jitter');
    const close = column('close', n, (i) => x.values[i] + 1e-7 * normal());
    expect(ols(sample(y, [x, close])).dropped).toEqual([]);
    const closer = column('closer', n, (i) => x.values[i] + 1e-11 * normal());
    expect(ols(sample(y, [x, closer])).dropped.map((d) => d.term)).toEqual(['closer']);
  });
});

describe('clustered errors', () => {
  test('clusters of one row are HC1', () => {
    const { x, z, y, n } = panel('own');
    const own = grouping('row', n, (i) => i);
    const clustered = ols(sample(y, [x, z], { errors: 'clustered', clusters: [own] }));
    const robust = ols(sample(y, [x, z], { errors: 'robust' }));
    for (const [j, term] of clustered.terms.entries()) near(term.std_error, robust.terms[j].std_error, ROUNDING);
  });

  test('the same grouping twice is that grouping once', () => {
    const { x, y, place } = panel('twice');
    const once = ols(sample(y, [x], { errors: 'clustered', clusters: [place] }));
    const twice = ols(sample(y, [x], { errors: 'clustered', clusters: [place, { ...place, name: 'again' }] }));
    for (const [j, term] of twice.terms.entries()) near(term.std_error, once.terms[j].std_error, ROUNDING);
  });

  test('an indefinite two-way covariance is mended and said so', () => {
    // residuals that cancel within both groupings leave V1 + V2 below V12
    const n = 16;
    const a = grouping('a', n, (i) => Math.floor(i / 4));
    const b = grouping('b', n, (i) => i % 4);
    const x = column('x', n, (i) => a.codes[i]);
    const y = column('y', n, (i) => ((a.codes[i] + b.codes[i]) % 2 === 0 ? 1 : -1));
    const fit = ols(sample(y, [x], { errors: 'clustered', clusters: [a, b] }));
    expect(fit.notes.join(' ')).toContain('set to zero');
    for (const term of fit.terms) expect(term.std_error).toBeGreaterThanOrEqual(0);
  });
});

describe('refusals', () => {
  const { x, y, n } = panel('refuse');
  const code = (run: () => unknown): string => {
    try {
      run();
    } catch (error) {
      return (error as { problems: { code: string }[] }).problems[0].code;
    }
    return 'none';
  };
  test('each its own code', () => {
    const one = grouping('one', n, () => 1);
    expect(code(() => ols(sample(y, [x], { errors: 'clustered', clusters: [one] })))).toBe('one-cluster');
    expect(
      code(() =>
        ols(
          sample(
            column('y', 5, () => 2),
            [column('x', 5, (i) => i)],
          ),
        ),
      ),
    ).toBe('no-variation');
    expect(
      code(() =>
        ols(
          sample(
            column('y', 0, () => 2),
            [column('x', 0, (i) => i)],
          ),
        ),
      ),
    ).toBe('empty-sample');
    const tiny = [column('a', 2, (i) => i), column('b', 2, (i) => i * i + 1)];
    expect(
      code(() =>
        ols(
          sample(
            column('y', 2, (i) => i),
            tiny,
          ),
        ),
      ),
    ).toBe('too-few-rows');
    expect(code(() => ols(sample(y, [column('zero', n, () => 0)], { constant: false })))).toBe('no-terms');
    const two = [grouping('g', n, (i) => i % 3), grouping('h', n, (i) => i % 5)];
    expect(code(() => ols(sample(y, [x], { effects: two, errors: 'robust-hc3' })))).toBe('hc3-effects');
  });
});

describe('laws', () => {
  const rows = fc.array(fc.tuple(fc.integer({ min: -50, max: 50 }), fc.integer({ min: -50, max: 50 })), {
    minLength: 8,
    maxLength: 40,
  });
  test('residuals do not depend on units: y → ay + bx, x → cx moves the slope by a and b, divided by c', () => {
    fc.assert(
      fc.property(
        rows,
        fc.integer({ min: 1, max: 9 }),
        fc.integer({ min: -9, max: 9 }),
        fc.constantFrom(1e-6, 8, 1e9),
        (data, a, b, c) => {
          const n = data.length;
          fc.pre(
            new Set(data.map((r) => r[0])).size > 2 &&
              new Set(data.map((r) => a * r[1] + b * r[0])).size > 1 &&
              new Set(data.map((r) => r[1])).size > 1,
          );
          const x = column('x', n, (i) => data[i][0]);
          const y = column('y', n, (i) => data[i][1]);
          const first = ols(sample(y, [x], { errors: 'robust' }));
          const moved = ols(
            sample(
              column('y', n, (i) => a * y.values[i] + b * x.values[i]),
              [column('x', n, (i) => c * x.values[i])],
              { errors: 'robust' },
            ),
          );
          // scaling by c rounds every value once; slopes up to a few hundred
          near(moved.terms[1].estimate * c, a * first.terms[1].estimate + b, 1e-9);
          near(moved.terms[1].std_error * c, a * first.terms[1].std_error, 1e-9);
        },
      ),
    );
  });

  test('the order of rows does not matter', () => {
    const { x, z, y, place, n } = panel('order');
    const back = (v: { name: string; values: Float64Array }) => ({ name: v.name, values: v.values.slice().reverse() });
    const fit = ols(copy(sample(y, [x, z], { effects: [place], errors: 'clustered', clusters: [place] })));
    const reversed = grouping('place', n, (i) => place.codes[n - 1 - i]);
    const other = ols(
      sample(back(y), [back(x), back(z)], { effects: [reversed], errors: 'clustered', clusters: [reversed] }),
    );
    for (const [j, term] of fit.terms.entries()) {
      near(other.terms[j].estimate, term.estimate, ROUNDING);
      near(other.terms[j].std_error, term.std_error, ROUNDING);
    }
  });
});

describe('groups', () => {
  const pairs = fc.array(fc.tuple(fc.integer({ min: 0, max: 6 }), fc.integer({ min: 0, max: 6 })), {
    minLength: 1,
    maxLength: 30,
  });

  test('rank of two effects is that of their dummies', () => {
    fc.assert(
      fc.property(pairs, (data) => {
        const a = groupsOf(
          'a',
          Int32Array.from(data, (r) => r[0]),
        );
        const b = groupsOf(
          'b',
          Int32Array.from(data, (r) => r[1]),
        );
        expect(effectsRank([a, b])).toBe(rank(a.codes, a.count, b.codes, b.count));
      }),
    );
  });

  test('no group of one row is left, and rows go only when they must', () => {
    fc.assert(
      fc.property(pairs, (data) => {
        const effects = [
          groupsOf(
            'a',
            Int32Array.from(data, (r) => r[0]),
          ),
          groupsOf(
            'b',
            Int32Array.from(data, (r) => r[1]),
          ),
        ];
        const kept = withoutSingletons(effects, data.length) ?? Int32Array.from(data, (_, i) => i);
        for (const effect of effects) {
          const size = new Map<number, number>();
          for (const i of kept) size.set(effect.codes[i], (size.get(effect.codes[i]) ?? 0) + 1);
          expect([...size.values()].every((s) => s > 1)).toBe(true);
        }
      }),
    );
  });

  test('cells are nested in both their groupings', () => {
    const a = groupsOf('a', Int32Array.from([5, 5, 2, 2, 9]));
    const b = groupsOf('b', Int32Array.from([1, 2, 1, 1, 1]));
    const both = cells(a, b);
    expect(both.count).toBe(4);
    expect(nestedIn(both, a) && nestedIn(both, b)).toBe(true);
    expect(nestedIn(a, b)).toBe(false);
  });
});

/** Rank of the dummies of two groupings, by elimination over the rationals (entries stay 0 or ±1). */
function rank(a: Int32Array, na: number, b: Int32Array, nb: number): number {
  const rows = [...new Set(Array.from(a, (g, i) => g * nb + b[i]))].map((cell) => {
    const row = new Array<number>(na + nb).fill(0);
    row[Math.floor(cell / nb)] = 1;
    row[na + (cell % nb)] = 1;
    return row;
  });
  let r = 0;
  for (let c = 0; c < na + nb; c++) {
    const p = rows.findIndex((row, i) => i >= r && row[c] !== 0);
    if (p < 0) continue;
    [rows[r], rows[p]] = [rows[p], rows[r]];
    for (let i = r + 1; i < rows.length; i++) {
      const f = rows[i][c] / rows[r][c];
      if (f !== 0) for (let j = c; j < na + nb; j++) rows[i][j] -= f * rows[r][j];
    }
    r++;
  }
  return r;
}
