import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { fromPairs, type Ties } from '../../../network/graph.js';
import { compileReference } from '../../../sim/model/reference.js';
import { similarityMeans, upwardMeans } from '../../../sim/model/set-statistic.js';
import type { Households, Milestone, Part } from '../../../sim/model/types.js';

const FROM = ['self', 'neighbours', 'second_circle', 'group', 'place', 'society'] as const;
const STATISTICS = ['mean', 'median', 'quantile', 'upward_mean', 'similarity_mean', 'max'] as const;

function part(from: Part['from'], statistic: Part['statistic'], weight = 1, q = 0.3, window = 0.4): Part {
  return { from, statistic, weight, q, window };
}

function milestone(mix: readonly Part[], scale = 1): Milestone {
  return { weight: 1, scale, mix };
}

interface World {
  readonly ties: Ties;
  readonly households: Households;
  readonly wealth: Float64Array;
}

/** Up to 14 households, any ties among them, some weighted, some with equal wealth. */
const worlds: fc.Arbitrary<World> = fc
  .integer({ min: 1, max: 14 })
  .chain((n) =>
    fc.record({
      n: fc.constant(n),
      pairs: fc.uniqueArray(
        fc.tuple(fc.nat(n - 1), fc.nat(n - 1)).map(([a, b]) => [Math.min(a, b), Math.max(a, b)] as const),
        {
          selector: ([a, b]) => a * n + b,
          maxLength: 3 * n,
        },
      ),
      weighted: fc.boolean(),
      weights: fc.array(fc.oneof(fc.constant(0), fc.double({ min: 0.1, max: 5, noNaN: true })), {
        minLength: 3 * n,
        maxLength: 3 * n,
      }),
      place: fc.array(fc.nat(2), { minLength: n, maxLength: n }),
      group: fc.array(fc.nat(1), { minLength: n, maxLength: n }),
      wealth: fc.array(fc.oneof(fc.constantFrom(1, 2, 5), fc.double({ min: 0.1, max: 100, noNaN: true })), {
        minLength: n,
        maxLength: n,
      }),
    }),
  )
  .map((drawn) => ({ ...drawn, pairs: drawn.pairs.filter(([a, b]) => a < b) }))
  .map(({ n, pairs, weighted, weights, place, group, wealth }) => ({
    ties: fromPairs(
      n,
      Uint32Array.from(pairs, ([a]) => a),
      Uint32Array.from(pairs, ([, b]) => b),
      weighted ? Float64Array.from(pairs, (_, e) => weights[e]) : null,
    ),
    households: {
      n,
      place: Uint32Array.from(place),
      places: 3,
      group: Uint32Array.from(group),
      groups: 2,
      childWeight: new Float64Array(n).fill(0.5),
    },
    wealth: Float64Array.from(wealth),
  }));

/** The definition of model and statistic, spelled out with sets and sorted lists. */
function byDefinition(world: World, p: Part, i: number): { value: number; isolated: boolean } {
  const { ties, households, wealth } = world;
  const near = (v: number): number[] => [...ties.target.subarray(ties.start[v], ties.start[v + 1])];
  const everyone = Array.from({ length: households.n }, (_, j) => j);
  const own = new Set([i, ...near(i)]);
  const members = {
    self: [i],
    neighbours: near(i),
    second_circle: [...new Set(near(i).flatMap(near))].filter((j) => !own.has(j)),
    group: everyone.filter((j) => households.group[j] === households.group[i]),
    place: everyone.filter((j) => households.place[j] === households.place[i]),
    society: everyone,
  }[p.from];
  const fallback = { value: wealth[i], isolated: true };
  if (p.from === 'self') return { value: wealth[i], isolated: false };
  if (members.length === 0) return fallback;
  const sorted = members.map((j) => wealth[j]).sort((a, b) => a - b);
  const mean = (values: number[], weights: number[]): number =>
    values.reduce((sum, v, e) => sum + v * weights[e], 0) / weights.reduce((sum, w) => sum + w, 0);
  const one = (values: number[]): number[] => values.map(() => 1);
  const quantile = (q: number): number => {
    const h = (sorted.length - 1) * q;
    const low = sorted[Math.floor(h)];
    return low + (h - Math.floor(h)) * (sorted[Math.ceil(h)] - low);
  };
  switch (p.statistic) {
    case 'mean': {
      if (p.from === 'neighbours' && ties.weight !== null) {
        const weights = [...ties.weight.subarray(ties.start[i], ties.start[i + 1])];
        if (weights.every((w) => w === 0)) return fallback;
        return {
          value: mean(
            members.map((j) => wealth[j]),
            weights,
          ),
          isolated: false,
        };
      }
      return { value: mean(sorted, one(sorted)), isolated: false };
    }
    case 'median':
      return { value: quantile(0.5), isolated: false };
    case 'quantile':
      return { value: quantile(p.q), isolated: false };
    case 'max':
      return { value: Math.max(...sorted), isolated: false };
    case 'upward_mean': {
      const richer = sorted.filter((v) => v > wealth[i]);
      return { value: richer.length > 0 ? mean(richer, one(richer)) : wealth[i], isolated: false };
    }
    default: {
      const distances = sorted.map((v) => (Math.log(v) - Math.log(wealth[i])) ** 2 / (2 * p.window ** 2));
      // a common factor does not matter, and keeps the weights of far members above underflow
      const least = Math.min(...distances);
      const weights = distances.map((d) => Math.exp(least - d));
      return { value: mean(sorted, weights), isolated: false };
    }
  }
}

// sums of up to 14 terms in another order, and exp and log of another make: a few units in the last place,
// multiplied by the exponent of a similarity weight (up to about 100)
const RTOL = 1e-13;

describe('every statistic over every set agrees with its definition', () => {
  test.each(FROM.flatMap((from) => STATISTICS.map((statistic) => [from, statistic] as const)))(
    '%s %s',
    (from, statistic) => {
      fc.assert(
        fc.property(worlds, fc.double({ min: 0, max: 1, noNaN: true }), (world, q) => {
          const p = part(from, statistic, 1, q);
          const { n } = world.households;
          for (const limit of [1e6, 0]) {
            const reference = compileReference([milestone([p])], 0, world.households, world.ties, limit);
            const out = new Float64Array(n);
            const isolated = new Uint8Array(n).fill(7);
            reference.form(world.wealth, null, [out], isolated);
            // a second time, as the next generation would
            reference.form(world.wealth, null, [out], isolated);
            for (let i = 0; i < n; i++) {
              const truth = byDefinition(world, p, i);
              expect(Math.abs(out[i] - truth.value), `household ${i}`).toBeLessThanOrEqual(RTOL * truth.value);
              expect(isolated[i]).toBe(truth.isolated ? 1 : 0);
              const [sight] = reference.referenceOf(i, world.wealth);
              expect(Math.abs(sight.value - truth.value)).toBeLessThanOrEqual(RTOL * truth.value);
            }
          }
        }),
        { numRuns: 60, seed: 1, endOnFailure: true },
      );
    },
  );
});

describe('mixes', () => {
  test('of any parts add up, are scaled, take a factor and persist', () => {
    const parts = fc.array(fc.record({ from: fc.constantFrom(...FROM), statistic: fc.constantFrom(...STATISTICS) }), {
      minLength: 1,
      maxLength: 4,
    });
    fc.assert(
      fc.property(worlds, parts, parts, fc.constantFrom(0, 0.3), (world, first, second, phi) => {
        const { n } = world.households;
        const milestones = [first, second].map((list, m) =>
          milestone(
            list.map((p) => part(p.from, p.statistic, 1 / list.length)),
            1 + m,
          ),
        );
        const reference = compileReference(milestones, phi, world.households, world.ties);
        const inherited = [new Float64Array(n).fill(3), new Float64Array(n).fill(8)];
        const factor = Float64Array.from({ length: n }, (_, i) => 1 + (i % 3));
        const out = [new Float64Array(n), new Float64Array(n)];
        const isolated = new Uint8Array(n);
        reference.form(world.wealth, inherited, out, isolated, factor);
        for (let i = 0; i < n; i++) {
          let alone = false;
          milestones.forEach((m, index) => {
            let sum = 0;
            for (const p of m.mix) {
              const truth = byDefinition(world, p, i);
              sum += p.weight * truth.value;
              alone ||= truth.isolated;
            }
            const formed = m.scale * factor[i] * sum;
            const truth = phi * inherited[index][i] + (1 - phi) * formed;
            expect(Math.abs(out[index][i] - truth)).toBeLessThanOrEqual(RTOL * truth);
          });
          expect(isolated[i]).toBe(alone ? 1 : 0);
        }
      }),
      { numRuns: 200, seed: 2, endOnFailure: true },
    );
  });

  test('the first generation inherits nothing even when aspirations persist', () => {
    const households = {
      n: 2,
      place: new Uint32Array(2),
      places: 1,
      group: new Uint32Array(2),
      groups: 1,
      childWeight: new Float64Array(2),
    };
    const ties = fromPairs(2, Uint32Array.of(0), Uint32Array.of(1), null);
    const reference = compileReference([milestone([part('neighbours', 'mean')])], 0.5, households, ties);
    const out = new Float64Array(2);
    reference.form(Float64Array.of(4, 10), null, [out], new Uint8Array(2));
    expect([...out]).toEqual([10, 4]);
  });

  test('scale 1 with means and quantiles stays within what the household sees', () => {
    fc.assert(
      fc.property(worlds, (world) => {
        const { n } = world.households;
        const mix = [part('self', 'mean', 0.3), part('neighbours', 'median', 0.4), part('place', 'quantile', 0.3)];
        const reference = compileReference([milestone(mix)], 0, world.households, world.ties);
        const out = new Float64Array(n);
        reference.form(world.wealth, null, [out], new Uint8Array(n));
        for (let i = 0; i < n; i++) {
          const seen = reference
            .referenceOf(i, world.wealth)
            .flatMap((sight) => [...(sight.members ?? [])].map((j) => world.wealth[j]));
          const all = [...seen, world.wealth[i]];
          // the weights 0.3, 0.4, 0.3 add up to 1 within rounding
          expect(out[i]).toBeGreaterThanOrEqual(Math.min(...all) * (1 - 1e-15));
          expect(out[i]).toBeLessThanOrEqual(Math.max(...all) * (1 + 1e-15));
        }
      }),
      { seed: 3, endOnFailure: true },
    );
  });
});

describe('large sets', () => {
  function lognormalSample(n: number, sd: number): Float64Array {
    // additive recurrence mapped through a crude normal: spread, ties and both tails, no generator needed
    return Float64Array.from({ length: n }, (_, i) => {
      const u = ((i + 1) * 0.6180339887498949) % 1;
      const v = ((i + 1) * 0.7548776662466927) % 1;
      return Math.exp(sd * Math.sqrt(-2 * Math.log(u)) * Math.cos(2 * Math.PI * v));
    }).sort();
  }

  test.each([0.02, 0.1, 0.3, 1, 3])('similarity mean with window %d agrees with the double sum', (h) => {
    const values = lognormalSample(3000, 1.2);
    // two households far out, where only they themselves and the edge of the crowd count
    values[0] = 1e-6;
    values[2999] = 1e5;
    const out = new Float64Array(3000);
    similarityMeans(values, h, out);
    for (let i = 0; i < 3000; i += 37) {
      let top = 0;
      let bottom = 0;
      for (const value of values) {
        const w = Math.exp(-((Math.log(value) - Math.log(values[i])) ** 2) / (2 * h * h));
        top += w * value;
        bottom += w;
      }
      // stated: 1e−10 through boxes, 1e−12 in pairs
      expect(Math.abs(out[i] / (top / bottom) - 1)).toBeLessThan(1e-10);
    }
    for (const i of [0, 1, 2998, 2999]) {
      let top = 0;
      let bottom = 0;
      for (const value of values) {
        const w = Math.exp(-((Math.log(value) - Math.log(values[i])) ** 2) / (2 * h * h));
        top += w * value;
        bottom += w;
      }
      expect(Math.abs(out[i] / (top / bottom) - 1)).toBeLessThan(1e-10);
    }
  });

  test('upward means of a million values keep full accuracy', () => {
    const values = lognormalSample(1_000_000, 1);
    const out = new Float64Array(values.length);
    upwardMeans(values, out);
    let exact = 0n;
    for (let i = values.length - 1; i > 0; i--) exact += BigInt(Math.round(values[i] * 2 ** 60));
    const mean = Number(exact) / 2 ** 60 / (values.length - 1);
    // compensated: a unit or two in the last place whatever the length; a plain sum is off by 1e−13
    expect(Math.abs(out[0] / mean - 1)).toBeLessThan(4e-16);
    expect(out[values.length - 1]).toBe(values[values.length - 1]);
  });
});
