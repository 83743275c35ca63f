import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { exp, log } from '../../../network/elementary.js';
import { KERNEL_BYTES, ROWS_BYTES } from '../../../sim/kernel/bytes.js';
import { compile } from '../../../sim/kernel/compile.mjs';
import { CHUNK, type Kernel, kernel } from '../../../sim/kernel/kernel.js';
import { rowKernel } from '../../../sim/kernel/rows.js';
import { PlannedChoice } from '../../../sim/model/planned.js';
import { plainMeans } from '../../../sim/model/row-statistic.js';
import type { Technology } from '../../../sim/model/types.js';
import { Draws } from '../../../sim/random/draws.js';

const compiled = kernel() as Kernel;

test('the bytes are those of the sources', async () => {
  expect(Buffer.from(await compile('kernel')).toString('base64')).toBe(KERNEL_BYTES);
  expect(Buffer.from(await compile('rows')).toString('base64')).toBe(ROWS_BYTES);
});

describe('gives the same bits as the TypeScript', () => {
  test('exp and log, over the whole range', () => {
    const any = fc.oneof(
      fc.double(),
      fc.double({ min: -745.2, max: 709.8 }),
      fc.constantFrom(0, -0, 1, Infinity, -Infinity, NaN, 5e-324, 1.7976931348623157e308, 2.2250738585072014e-308),
    );
    fc.assert(
      fc.property(any, (x) => {
        expect(compiled.call.exp(x)).toBe(exp(x));
        expect(compiled.call.log(x)).toBe(log(x));
      }),
      { numRuns: 4000, seed: 1, endOnFailure: true },
    );
  });

  test.each([1, 2, CHUNK - 1, CHUNK, CHUNK + 1, 5001])('draws of %i households', (n) => {
    const draws = new Draws('kernel', 7);
    const fast = new Float64Array(n);
    const plain = new Float64Array(n);
    draws.normals('householdShock', 3, fast);
    draws.fillPlainly(true, 'householdShock', 3, plain);
    expect(fast).toEqual(plain);
    draws.uniforms('resample', 3, fast);
    draws.fillPlainly(false, 'resample', 3, plain);
    expect(fast).toEqual(plain);
  });

  test('means and upward means, for rows of any length and graphs in turn', () => {
    const graph = fc.integer({ min: 1, max: 40 }).chain((n) =>
      fc.record({
        rows: fc.array(fc.array(fc.nat(n - 1), { maxLength: 12 }), { minLength: n, maxLength: n }),
        wealth: fc.array(fc.oneof(fc.constantFrom(0, 1, 2), fc.double({ min: 0, max: 1e6, noNaN: true })), {
          minLength: n,
          maxLength: n,
        }),
      }),
    );
    fc.assert(
      fc.property(fc.array(graph, { minLength: 1, maxLength: 3 }), (graphs) => {
        const cases = graphs.map(({ rows, wealth }) => {
          const start = new Uint32Array(rows.length + 1);
          rows.forEach((row, i) => {
            start[i + 1] = start[i] + row.length;
          });
          return { start, target: Uint32Array.from(rows.flat()), weight: null, wealth: Float64Array.from(wealth) };
        });
        // twice over, so that each takes the memory from the others
        for (const c of [...cases, ...cases]) {
          for (const upward of [false, true]) {
            const fast = new Float64Array(c.wealth.length);
            const plain = new Float64Array(c.wealth.length);
            expect(rowKernel()?.means(upward, c.start, c.target, c.wealth, fast)).toBe(true);
            plainMeans(upward, c, c.wealth, plain);
            expect(fast).toEqual(plain);
          }
        }
      }),
      { numRuns: 300, seed: 3, endOnFailure: true },
    );
  });

  test('plans, for every technology and shape', () => {
    const positive = (min: number, max: number): fc.Arbitrary<number> => fc.double({ min, max, noNaN: true });
    const technologies: fc.Arbitrary<Technology> = fc.oneof(
      positive(0.5, 4).map((grossReturn) => ({ kind: 'linear' as const, grossReturn })),
      fc
        .tuple(positive(0.5, 10), positive(0.1, 0.95), fc.oneof(fc.constant(1), positive(0, 1)))
        .map(([scale, elasticity, depreciation]) => ({ kind: 'concave' as const, scale, elasticity, depreciation })),
    );
    const settings = fc.record({
      technology: technologies,
      curvature: fc.oneof(fc.constant(1), positive(0.2, 3)),
      milestoneCurvature: positive(0.1, 0.9),
      same: fc.boolean(),
      milestoneShape: fc.constantFrom('threshold' as const, 'gain-loss' as const),
      lossAversion: positive(1, 3),
      weights: fc.array(fc.oneof(fc.constant(0), positive(0.01, 2)), { minLength: 0, maxLength: 4 }),
      households: fc.array(
        fc.record({
          wealth: positive(0.1, 500),
          delta: positive(0.05, 2),
          ratio: fc.array(positive(0, 4), { minLength: 4, maxLength: 4 }),
        }),
        { minLength: 1, maxLength: 8 },
      ),
    });
    fc.assert(
      fc.property(settings, ({ technology, weights, households, same, ...rest }) => {
        const eta = same && rest.curvature < 1 ? rest.curvature : rest.milestoneCurvature;
        const choice = new PlannedChoice(technology, { ...rest, milestoneCurvature: eta, childWeight: 0.5 }, weights);
        choice.prepare(compiled);
        households.forEach(({ wealth, delta, ratio }, i) => {
          compiled.wealth[i] = wealth;
          compiled.childWeight[i] = delta;
          weights.forEach((_, m) => {
            compiled.aspirations[m][i] = ratio[m] * wealth;
          });
        });
        compiled.call.choose(households.length);
        households.forEach(({ wealth, delta, ratio }, i) => {
          choice.solve(
            wealth,
            ratio.map((q) => q * wealth),
            delta,
          );
          expect(compiled.planned[i]).toBe(choice.planned);
          expect(compiled.investment[i]).toBe(choice.investment);
          expect(compiled.met[i]).toBe(choice.met);
        });
      }),
      { numRuns: 2000, seed: 2, endOnFailure: true },
    );
  });
});
