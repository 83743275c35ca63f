/** Hand-checkable inequality values (exact fractions where there are any); data inside expected.json. */
import { describe, expect, test } from 'vitest';
import { atkinson, generalisedEntropy2, theilL, theilT } from '../../sim/measure/entropy.js';
import { estebanRay } from '../../sim/measure/esteban-ray.js';
import { gini, giniSmallSample } from '../../sim/measure/gini.js';
import { lorenz } from '../../sim/measure/lorenz.js';
import { hoover } from '../../sim/measure/spread.js';
import { checksOf, expectMatch } from './expected.js';

const checks = checksOf('ineq-toy');
const measures: Record<string, (x: number[]) => unknown> = {
  gini: (x) => gini(x),
  gini_unbiased: (x) => giniSmallSample(x),
  theil_T: (x) => theilT(x),
  theil_L: (x) => theilL(x),
  ge2: (x) => generalisedEntropy2(x),
  hoover: (x) => hoover(x),
  atkinson: (x) => [0.5, 1, 2].map((aversion) => atkinson(x, aversion)),
  lorenz_at: (x) => lorenz(x, [0.1, 0.2, 0.5, 0.8, 1]),
};

describe('ineq-toy', () => {
  for (const [id, check] of Object.entries(checks)) {
    const measure = measures[id.split('.')[1]];
    test(id, () => {
      if (id === 'weighted.gini') {
        expectMatch(gini(check.data as number[], { weights: check.weights as number[] }), check, id);
      } else if (id.startsWith('esteban_ray.')) {
        const at = [0, 0.5, 1, 1.3, 1.6].map((alpha) =>
          estebanRay(check.groups as number[], check.values as number[], alpha),
        );
        expectMatch(at, check, id);
      } else if (check.value === null) {
        // the set's convention: null stands for plus infinity
        expect(measure(check.data as number[])).toBe(Infinity);
      } else {
        expectMatch(measure(check.data as number[]), check, id);
      }
    });
  }
});
