/**
 * Hartigan's dip of ten samples against the R package diptest 0.76-0, confirmed by linear programming from the
 * definition; p-values by interpolation in the same table of quantiles.
 */
import { describe, expect, test } from 'vitest';
import { dip, dipTest } from '../../sim/measure/dip.js';
import { DIP_PROBABILITIES, DIP_QUANTILES, DIP_SIZES } from '../../sim/measure/dip-table.js';
import { checksOf, columnsOf, expectMatch } from './expected.js';

const { sample, x } = columnsOf('dip-shipped', 'data.csv');

describe('dip-shipped', () => {
  for (const [id, check] of Object.entries(checksOf('dip-shipped'))) {
    const [name, what] = id.split('.');
    const values = x.filter((_, i) => sample[i] === name).map(Number);
    test(id, () => {
      if (what === 'dip') expectMatch(dip(values).dip, check, id);
      else if (what === 'p') expectMatch(dipTest(values).p, check, id);
      else if (what === 'modal_interval') expectMatch([dip(values).low, dip(values).high], check, id);
      else throw new Error(`nothing tests ${id}`);
    });
  }

  test('the shipped table is the published one', () => {
    const table = columnsOf('dip-shipped', 'qdiptab.csv');
    const { n, ...columns } = table;
    expect(Array.from(DIP_SIZES)).toEqual(n.map(Number));
    const byProbability = Object.entries(columns).sort(([a], [b]) => Number(a) - Number(b));
    expect(Array.from(DIP_PROBABILITIES)).toEqual(byProbability.map(([p]) => Number(p)));
    for (let r = 0; r < n.length; r++) {
      expect(Array.from(DIP_QUANTILES[r])).toEqual(byProbability.map(([, values]) => Number(values[r])));
    }
  });
});
