import { expect, test } from 'vitest';
import { frustrationRows, meanAspirationGap, shareFrustrated } from '../../../sim/measure/frustration.js';

test('shares and growth by group, fifth of places and fifth of households', () => {
  // ten households in five places of two, wealth rising with the number
  const wealth = Float64Array.from({ length: 10 }, (_, i) => 10 + i);
  const frustrated = Uint8Array.from([1, 1, 1, 0, 0, 0, 0, 0, 0, 1]);
  const growth = Float64Array.from({ length: 10 }, (_, i) => (frustrated[i] === 1 ? 1 : 1.5));
  const place = Uint32Array.from([0, 0, 1, 1, 2, 2, 3, 3, 4, 4]);
  const group = Uint32Array.from([0, 1, 0, 1, 0, 1, 0, 1, 0, 1]);
  const rows = frustrationRows({
    wealth,
    frustrated,
    growth,
    place,
    group,
    places: 5,
    groupNames: ['low', 'high'],
  });
  expect(rows.filter((r) => r.by === 'group')).toEqual([
    { by: 'group', level: 'low', households: 5, shareFrustrated: 0.4, meanGrowth: 1.3 },
    { by: 'group', level: 'high', households: 5, shareFrustrated: 0.4, meanGrowth: 1.3 },
  ]);
  const byPlace = rows.filter((r) => r.by === 'place_quintile');
  expect(byPlace.map((r) => r.level)).toEqual(['1', '2', '3', '4', '5']);
  expect(byPlace.map((r) => r.shareFrustrated)).toEqual([1, 0.5, 0, 0, 0.5]);
  expect(rows.filter((r) => r.by === 'wealth_quintile').map((r) => r.shareFrustrated)).toEqual([1, 0.5, 0, 0, 0.5]);
  for (const by of ['group', 'place_quintile', 'wealth_quintile']) {
    const households = rows.filter((r) => r.by === by).reduce((s, r) => s + r.households, 0);
    expect(households, by).toBe(10);
  }
});

test('fifths that hold nobody have no row', () => {
  const rows = frustrationRows({
    wealth: [1, 2],
    frustrated: [0, 1],
    growth: [1, 1],
    place: [0, 0],
    group: [0, 0],
    places: 1,
    groupNames: ['all', 'nobody'],
  });
  expect(rows.map((r) => `${r.by} ${r.level}`)).toEqual([
    'group all',
    'place_quintile 3',
    'wealth_quintile 2',
    'wealth_quintile 4',
  ]);
});

test('the gap is the mean of 1 − wealth/aspiration over households that aspire to something', () => {
  expect(meanAspirationGap([1, 3, 5], [2, 2, 0])).toBe(0);
  expect(meanAspirationGap([1, 1], [2, 4])).toBe(0.625);
  expect(shareFrustrated(Uint8Array.of(1, 0, 0, 1))).toBe(0.5);
});
