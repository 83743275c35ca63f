/** Intervals of ties: when they begin, end and begin again. */
import { expect, test } from 'vitest';
import { fromPairs, type Ties } from '../../../network/graph.js';
import { TieSpans } from '../../../sim/results/ties.js';

function graph(pairs: readonly [number, number, number][], weighted = true): Ties {
  return fromPairs(
    4,
    Uint32Array.from(pairs, ([a]) => a),
    Uint32Array.from(pairs, ([, b]) => b),
    weighted ? Float64Array.from(pairs, ([, , w]) => w) : null,
  );
}

function rows(spans: TieSpans, last: number): number[][] {
  const { source, target, weight, from, to } = spans.intervals(last);
  return [...source].map((s, k) => [from[k], to[k], s, target[k], weight === null ? 1 : weight[k]]);
}

test('ties that never change stand from the first to the last generation', () => {
  const spans = new TieSpans();
  spans.see(
    0,
    graph(
      [
        [2, 1, 1],
        [0, 3, 1],
      ],
      false,
    ),
  );
  expect(rows(spans, 9)).toEqual([
    [0, 9, 0, 3, 1],
    [0, 9, 1, 2, 1],
  ]);
});

test('a tie that goes and comes back has two intervals; a changed weight starts a new one', () => {
  const spans = new TieSpans();
  spans.see(
    0,
    graph([
      [0, 1, 1],
      [1, 2, 1],
      [2, 3, 5],
    ]),
  );
  spans.see(
    2,
    graph([
      [1, 2, 1],
      [2, 3, 6],
    ]),
  );
  spans.see(
    3,
    graph([
      [0, 1, 1],
      [0, 2, 1],
      [1, 2, 1],
      [2, 3, 6],
    ]),
  );
  expect(rows(spans, 4)).toEqual([
    [0, 1, 0, 1, 1],
    [3, 4, 0, 1, 1],
    [3, 4, 0, 2, 1],
    [0, 4, 1, 2, 1],
    [0, 1, 2, 3, 5],
    [2, 4, 2, 3, 6],
  ]);
});
