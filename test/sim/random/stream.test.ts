import { expect, test } from 'vitest';
import { stream } from '../../../sim/random/stream.js';

test('a stream is fixed by seed, replicate and purpose, and each of them matters', () => {
  const first = (seed: string, replicate: number, purpose: string): number => stream(seed, replicate, purpose)();
  expect(first('s', 0, 'network')).toBe(first('s', 0, 'network'));
  const values = [
    first('s', 0, 'network'),
    first('s', 1, 'network'),
    first('t', 0, 'network'),
    first('s', 0, 'mix'),
    // parts that would run together if simply joined
    first('s,0', 0, 'network'),
    first('s', 0, '0,network'),
  ];
  expect(new Set(values).size).toBe(values.length);
});

test('two streams do not disturb each other', () => {
  const a = stream('s', 0, 'network');
  const alone = [a(), a(), a()];
  const b = stream('s', 0, 'network');
  const other = stream('s', 1, 'network');
  const between = alone.map(() => {
    other();
    return b();
  });
  expect(between).toEqual(alone);
  for (const u of alone) expect(u >= 0 && u < 1).toBe(true);
});
