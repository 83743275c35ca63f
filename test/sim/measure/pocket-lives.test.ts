import { expect, test } from 'vitest';
import type { PocketEvent } from '../../../sim/measure/life-lines.js';
import { type PocketRecord, pocketLives } from '../../../sim/measure/pocket-lives.js';

const row = (
  generation: number,
  pocket: number,
  size: number,
  event: PocketEvent,
  pValue = NaN,
  parent: number | null = null,
): PocketRecord => ({ generation, pocket, size, event, pValue, parent });

test('a life is told from its rows', () => {
  const lives = pocketLives([
    row(2, 0, 8, 'born', 0.2),
    row(3, 0, 20, 'grows', 0.005),
    row(3, 1, 5, 'splits', 0.9, 0),
    row(4, 0, 12, 'shrinks', 0.03),
    row(4, 1, 0, 'absorbed', NaN, 0),
    row(5, 0, 0, 'dissolves'),
    row(5, 2, 6, 'born', 0.5),
  ]);
  expect(lives).toEqual([
    {
      pocket: 0,
      firstGeneration: 2,
      lastGeneration: 4,
      generations: 3,
      began: 'born',
      parent: null,
      ended: 'dissolves',
      into: null,
      peakSize: 20,
      peakGeneration: 3,
      smallestP: 0.005,
    },
    {
      pocket: 1,
      firstGeneration: 3,
      lastGeneration: 3,
      generations: 1,
      began: 'splits',
      parent: 0,
      ended: 'absorbed',
      into: 0,
      peakSize: 5,
      peakGeneration: 3,
      smallestP: 0.9,
    },
    {
      pocket: 2,
      firstGeneration: 5,
      lastGeneration: 5,
      generations: 1,
      began: 'born',
      parent: null,
      ended: 'lasts',
      into: null,
      peakSize: 6,
      peakGeneration: 5,
      smallestP: 0.5,
    },
  ]);
});
