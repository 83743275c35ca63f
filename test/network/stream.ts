/** A seeded stream and invented households for the tests of networks. */
import seedrandom from 'seedrandom';
import type { Labels, Uniform } from '../../network/graph.js';

export function stream(seed: string): Uniform {
  const generator = seedrandom(seed);
  return () => generator();
}

/**
 * Households in places of unequal size, two groups at random, wealth that differs by place and group.
 * @param places - number of places; sizes are drawn between half and one and a half times n / places
 */
export function households(n: number, places: number, seed = 'households', minority = 0.35): Labels {
  const uniform = stream(seed);
  const weight = Array.from({ length: places }, () => 0.5 + uniform());
  const total = weight.reduce((a, b) => a + b, 0);
  const place = new Uint32Array(n);
  let at = 0;
  let share = 0;
  weight.forEach((w, p) => {
    share += w / total;
    const to = p === places - 1 ? n : Math.round(share * n);
    place.fill(p, at, to);
    at = to;
  });
  const group = Uint32Array.from({ length: n }, () => (uniform() < minority ? 1 : 0));
  const rich = Array.from({ length: places }, () => 1 + 3 * uniform());
  const wealth = Float64Array.from(place, (p, i) => rich[p] * (0.2 + uniform()) * (group[i] === 1 ? 0.5 : 1));
  return { n, place, group, wealth };
}
