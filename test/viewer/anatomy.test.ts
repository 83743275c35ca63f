/**
 * The decision anatomy is the engine's own decision: for every household of a real run, in several models.
 */
import { describe, expect, test } from 'vitest';
import type { Model } from '../../sim/model/types.js';
import { loadInputs } from '../../sim/study/inputs.js';
import { parseStudy } from '../../sim/study/parse.js';
import { simulate } from '../../sim/study/replicate.js';
import { anatomy, decide, mixInWords, mostPlanned, wealthThatWouldDo } from '../../viewer/drawer/anatomy.js';
import { HAMLETS } from '../browser/results.js';

const TWO = HAMLETS.replace(
  'reference:\n  milestones:\n',
  'reference:\n  milestones:\n    - {weight: 0.5, scale: 1.4, mix: [{from: society, weight: 1}]}\n',
);
const LINEAR = HAMLETS.replace('{kind: concave, scale: 8, elasticity: 0.6}', '{kind: linear, gross_return: 2.5}');
const LOSSES = HAMLETS.replace(
  'child_weight: 0.5}',
  'child_weight: 0.5, milestone_shape: gain-loss, loss_aversion: 2}',
);
const EXPECTED = HAMLETS.replace('{sd_log: 0.2}', '{sd_log: 0.2, risk: expected}');

describe.each([
  ['concave', HAMLETS],
  ['two milestones', TWO],
  ['linear', LINEAR],
  ['gain and loss', LOSSES],
  ['expected risk', EXPECTED],
])('%s', (_name, yaml) => {
  test('the highest drawn peak is what the household did, and no drawn point lies above it', async () => {
    const parsed = parseStudy(yaml, 'study.yaml');
    const inputs = await loadInputs(parsed, async () => null);
    let model: Model | null = null;
    let childWeight = new Float64Array();
    let group = new Uint32Array();
    let checked = 0;
    simulate(
      { study: parsed.study, inputs },
      0,
      {
        armStarts: (record) => {
          model = record.model;
          childWeight = Float64Array.from(record.households.childWeight);
          group = Uint32Array.from(record.households.group);
        },
        generation: ({ decided, columns, generation }) => {
          if (!decided || generation % 2 === 1 || model === null) return;
          for (let i = generation; i < columns.wealth.length; i += 23) {
            const problem = {
              model,
              group: group[i],
              wealth: columns.wealth[i],
              aspirations: columns.aspirations.map((a) => a[i]),
              childWeight: childWeight[i],
            };
            const drawn = anatomy(problem);
            const best = drawn.peaks[drawn.chosen];
            // the engine's own accuracy for plans is 1e-9
            expect(Math.abs(best.planned / columns.planned[i] - 1)).toBeLessThan(2e-9);
            expect(best.met).toBe(columns.met[i]);
            expect(decide(problem)).toEqual({ planned: columns.planned[i], met: columns.met[i] });
            const size = Math.abs(best.utility) + 1;
            for (let k = 0; k < drawn.utility.length; k++) {
              // rounding of the objective: a few units of its size
              if (drawn.utility[k] > best.utility + 1e-12 * size) expect(drawn.utility[k]).toBe(best.utility);
              if (k > 0) expect(drawn.planned[k]).toBeGreaterThanOrEqual(drawn.planned[k - 1]);
            }
            expect(drawn.planned[drawn.planned.length - 1]).toBeLessThanOrEqual(
              mostPlanned(model, problem.wealth) * (1 + 1e-12),
            );
            const enough = wealthThatWouldDo(problem);
            if (columns.met[i] > 0) expect(enough).toBeNaN();
            else if (!Number.isNaN(enough)) {
              expect(decide({ ...problem, wealth: enough }).met).toBeGreaterThan(0);
              expect(decide({ ...problem, wealth: enough * 0.999 }).met).toBe(0);
            }
            checked++;
          }
        },
        armEnds: () => {},
      },
      ['apart'],
    );
    expect(checked).toBeGreaterThan(60);
  });
});

test('a mix reads as a sentence', () => {
  const parsed = parseStudy(TWO, 'study.yaml');
  expect(parsed.study.reference.milestones.length).toBe(2);
  const model = {
    milestones: [
      {
        weight: 1,
        scale: 1.2,
        mix: [
          { from: 'neighbours', statistic: 'upward_mean', weight: 0.7, q: 0.5, window: 1 },
          { from: 'place', statistic: 'quantile', weight: 0.2, q: 0.9, window: 1 },
          { from: 'self', statistic: 'mean', weight: 0.1, q: 0.5, window: 1 },
        ],
      },
    ],
  } as unknown as Model;
  expect(mixInWords(model, 0)).toBe('1.2 × (0.7 richer neighbours + 0.2 its place (quantile 0.9) + 0.1 itself)');
});
