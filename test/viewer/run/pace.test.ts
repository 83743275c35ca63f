import { describe, expect, test } from 'vitest';
import { Pace, timeWords } from '../../../viewer/run/pace.js';

describe('the pace of a run', () => {
  test('says nothing before there is anything to say', () => {
    const pace = new Pace(1000);
    expect(pace.words()).toBe('starting');
    pace.see(0, 0);
    pace.see(0, 1000);
    expect(pace.left).toBeNaN();
  });

  test('steady work gives its rate and what is left', () => {
    const pace = new Pace(100_000);
    for (let t = 0; t <= 5; t++) pace.see(1000 * t, 1000 * t);
    expect(pace.rate).toBe(1000);
    expect(pace.left).toBe(95);
    expect(pace.words()).toBe('2 min left\n1\u202f000 household-generations/s');
  });

  test('follows a run that slows down', () => {
    const pace = new Pace(1e6);
    let done = 0;
    for (let t = 0; t <= 60; t++) pace.see((done += t < 30 ? 10_000 : 100), 1000 * t);
    // the last six seconds are slow throughout
    expect(pace.rate).toBe(100);
  });

  test.each([
    [0.2, '1 s'],
    [89, '89 s'],
    [90, '2 min'],
    [3600, '60 min'],
    [7800, '2 h 10 min'],
  ])('%d seconds are %s', (seconds, words) => {
    expect(timeWords(seconds)).toBe(words);
  });
});
