import fc from 'fast-check';
import { expect, test } from 'vitest';
import { build } from '../../../network/build/build.js';
import { InputError } from '../../../network/errors.js';
import { degrees, fromPairs, type Labels, type Ties, tieCount, toPairs } from '../../../network/graph.js';
import { rankAssortativity } from '../../../network/measure/assortativity.js';
import { economicConnectedness } from '../../../network/measure/economic-connectedness.js';
import { externalInternal, groupTies } from '../../../network/measure/mixing-by-group.js';
import { mix } from '../../../network/mix/mix.js';
import { MIX_TARGETS, type MixSpec, type MixTarget } from '../../../network/mix/spec.js';
import { households, stream } from '../stream.js';

/** The measure a target names, computed from scratch. */
function measured(target: MixTarget, ties: Ties, labels: Labels): number {
  switch (target) {
    case 'assortativity':
      return rankAssortativity(ties, labels.wealth);
    case 'economic_connectedness':
      return economicConnectedness(ties, labels.wealth, labels.place).connectedness;
    case 'e_i_group':
      return externalInternal(groupTies(ties, labels.group));
  }
}

function expectKept(before: Ties, after: Ties): void {
  expect(degrees(after)).toEqual(degrees(before));
  const { source, target } = toPairs(after);
  const pairs = new Set<number>();
  for (let e = 0; e < source.length; e++) {
    expect(source[e]).toBeLessThan(target[e]);
    pairs.add(source[e] * after.n + target[e]);
  }
  expect(pairs.size).toBe(tieCount(before));
  expect(weights(after)).toEqual(weights(before));
}

const weights = (ties: Ties): number[] => [...(toPairs(ties).weight ?? [])].sort((a, b) => a - b);

const labels = households(600, 10);
const segregated = build(
  { kind: 'blocks', mean_degree: 8, within_place: 0.95, within_group: 0.8 },
  labels,
  stream('s'),
);

test('any mixing of any small network keeps degrees, weights and simplicity', () => {
  const mixing = fc.oneof(
    fc.record({ share: fc.double({ min: 0, max: 1, noNaN: true }) }),
    fc.record({
      target: fc.constantFrom(...MIX_TARGETS),
      value: fc.double({ min: 0, max: 1, noNaN: true }),
      best_effort: fc.constant(true),
    }),
  );
  fc.assert(
    fc.property(
      fc.integer({ min: 4, max: 30 }),
      fc.double({ min: 0.5, max: 3, noNaN: true }),
      mixing,
      fc.integer(),
      (n, degree, spec, seed) => {
        const few = households(n, 2, String(seed));
        const plain = build({ kind: 'random', mean_degree: degree }, few, stream(String(seed)));
        const { source, target } = toPairs(plain);
        const ties = fromPairs(
          n,
          source,
          target,
          Float64Array.from(source, (_, e) => e + 1),
        );
        try {
          const result = mix(ties, spec as MixSpec, few, stream(`m${seed}`));
          expectKept(ties, result.ties);
          if ('target' in spec) expect(result.reached).toBeCloseTo(measured(spec.target, result.ties, few), 9);
        } catch (error) {
          // a network without ties, or of equals, has no such measure
          if (!(error instanceof InputError)) throw error;
          expect(error.problems[0].code).toBe('target-undefined');
        }
      },
    ),
    { numRuns: 150 },
  );
});

test.each([
  ['economic_connectedness', 0.95],
  ['economic_connectedness', 0.2],
  ['assortativity', 0],
  ['assortativity', 0.8],
  ['assortativity', -0.5],
  ['e_i_group', 0],
  ['e_i_group', -0.9],
] as const)('reaches %s %s from where it stands, and stops there', (target, value) => {
  const result = mix(segregated, { target, value }, labels, stream('t'));
  expectKept(segregated, result.ties);
  expect(result.before).toBeCloseTo(measured(target, segregated, labels), 9);
  expect(result.reached).toBeCloseTo(measured(target, result.ties, labels), 9);
  // the tolerance of a target
  expect(Math.abs(result.reached - value)).toBeLessThan(0.005);
  expect(result.outOfReach).toBe(false);
  expect(result.accepted).toBeGreaterThan(0);
  expect(result.tried).toBeGreaterThanOrEqual(result.accepted);
});

test('a target already met changes nothing', () => {
  const value = measured('assortativity', segregated, labels);
  const result = mix(segregated, { target: 'assortativity', value }, labels, stream('t'));
  expect(result.accepted).toBe(0);
  expect(result.ties.target).toEqual(segregated.target);
});

test.each([0, 0.1, 0.5, 1])('swaps a share of %s of the ties and leaves the rest', (share) => {
  const result = mix(segregated, { share }, labels, stream('share'));
  expectKept(segregated, result.ties);
  const m = tieCount(segregated);
  expect(Math.abs(result.reached - share)).toBeLessThanOrEqual(2 / m);
  const before = new Set(pairsOf(segregated));
  const kept = pairsOf(result.ties).filter((pair) => before.has(pair)).length;
  // a swap may bring an old tie back by chance: a few in a thousand here
  expect(Math.abs(kept / m - (1 - share))).toBeLessThan(0.02);
});

function pairsOf(ties: Ties): number[] {
  const { source, target } = toPairs(ties);
  return Array.from(source, (s, e) => s * ties.n + target[e]);
}

test('all ties swapped: place, group and wealth no longer matter', () => {
  const { ties } = mix(segregated, { share: 1 }, labels, stream('all'));
  // sd of an index over 2,400 ties is 0.02; four of these
  expect(Math.abs(measured('assortativity', ties, labels))).toBeLessThan(0.08);
  expect(Math.abs(measured('economic_connectedness', ties, labels) - 1)).toBeLessThan(0.1);
});

test('a second seed gives another network, the same seed the same', () => {
  const a = mix(segregated, { share: 0.5 }, labels, stream('a')).ties.target;
  expect(mix(segregated, { share: 0.5 }, labels, stream('a')).ties.target).toEqual(a);
  expect(mix(segregated, { share: 0.5 }, labels, stream('b')).ties.target).not.toEqual(a);
});

// published extreme cases of degree-preserving rewiring: no second simple network has these degrees
test.each([
  ['star', 8],
  ['path', 3],
  ['complete', 6],
])('a %s of %i cannot be rewired, and says so', (name, n) => {
  const few = households(n, 1);
  const ties = build({ kind: 'named', name }, few, stream('x'));
  const shared = mix(ties, { share: 1 }, few, stream('x'));
  expect(shared.rewirable).toBe(false);
  expect(shared.accepted).toBe(0);
  expect(shared.outOfReach).toBe(true);
  expect(shared.ties.target).toEqual(ties.target);
  const spec = { target: 'economic_connectedness', value: 0.123 } as const;
  expect(() => mix(ties, spec, few, stream('x'))).toThrow(/no two ties of this network can be swapped/);
  const best = mix(ties, { ...spec, best_effort: true }, few, stream('x'));
  expect(best.rewirable).toBe(false);
  expect(best.ties.target).toEqual(ties.target);
});

test('a path of four can be rewired into the other paths of its degrees', () => {
  const few = households(4, 1);
  const ties = build({ kind: 'named', name: 'path' }, few, stream('x'));
  const result = mix(ties, { share: 1 }, few, stream('x'));
  expect(result.rewirable).toBe(true);
  expect(degrees(result.ties)).toEqual(degrees(ties));
});

test('the karate club keeps its degrees, and its degree sequence has wide room', () => {
  const club = households(34, 1);
  const ties = build({ kind: 'named', name: 'karate_club' }, club, stream('x'));
  for (const value of [-0.3, 0, 0.3]) {
    const result = mix(ties, { target: 'assortativity', value }, club, stream('k'));
    expectKept(ties, result.ties);
    expect(Math.abs(result.reached - value)).toBeLessThan(0.005);
  }
});

test('an impossible target is refused with what was reached, or kept with best effort', () => {
  // a third of the households are of the smaller group: most ties must stay in the larger
  const spec = { target: 'e_i_group', value: 1 } as const;
  try {
    mix(segregated, spec, labels, stream('t'));
    expect.unreachable('not every tie can cross');
  } catch (error) {
    expect(error).toBeInstanceOf(InputError);
    const [first] = (error as InputError).problems;
    expect(first.code).toBe('target-out-of-reach');
    expect(first.problem).toMatch(/it started at -0\.\d+ and swaps ended at 0\.\d+/);
  }
  const best = mix(segregated, { ...spec, best_effort: true }, labels, stream('t'));
  expect(best.outOfReach).toBe(true);
  // every tie of the smaller group crosses: twice its ends, less all ends, over all ends
  const { ends, totalEnds } = groupTies(segregated, labels.group);
  expect(best.reached).toBeCloseTo((4 * Math.min(ends[0], ends[1])) / totalEnds - 1, 2);
  expectKept(segregated, best.ties);
});

test.each([
  [{ share: 1.2 }, 'mix-share'],
  [{ share: NaN }, 'mix-share'],
  [{ target: 'assortativity', value: 2 }, 'mix-value'],
  [{ target: 'economic_connectedness', value: -0.1 }, 'mix-value'],
] as [MixSpec, string][])('%j is refused as %s', (spec, code) => {
  try {
    mix(segregated, spec, labels, stream('x'));
    expect.unreachable('should be refused');
  } catch (error) {
    expect((error as InputError).problems[0].code).toBe(code);
  }
});
