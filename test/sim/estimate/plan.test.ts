import { describe, expect, test } from 'vitest';
import { z } from 'zod';
import type { InputError } from '../../../network/errors.js';
import { Estimates, parsePlan } from '../../../sim/estimate/plan.js';

function problems(text: string): { code: string; place: string; text: string }[] {
  try {
    parsePlan(text, 'plan.yaml');
  } catch (error) {
    return (error as InputError).problems.map((p) => ({
      code: p.code,
      place: p.place,
      text: `${p.problem}; ${p.remedy}`,
    }));
  }
  return [];
}

const one = (lines: string): string => `estimates:\n  - name: A\n    outcome: y\n    covariates: [x]\n${lines}`;

describe('a good plan', () => {
  test('fills in defaults', () => {
    const plan = parsePlan(one(''), 'plan.yaml');
    expect(plan.estimates[0]).toMatchObject({
      method: 'ols',
      constant: true,
      effects: [],
      draw: 'everyone',
      level: 0.95,
    });
  });

  test('takes every kind of term, grouping and filter', () => {
    const plan = parsePlan(
      `estimates:
  - name: All
    outcome: {lead: log_wealth}
    covariates:
      - x
      - {square: x}
      - {power: [{log: x}, 3]}
      - {product: [{dummy: arm}, {lag: {square: x}}]}
      - {dummy: group, base: lowland}
    effects: [place, {product: [place, generation]}]
    cluster: place
    where: {arm: [a, b], generation: [1, 8], isolated: 0, wealth: {from: 10}, place: {in: [1, 2, 3]}, group: upland}
    draw: {places: 40, households_per_place: 25}
    truth: {x: 1}
`,
      'plan.yaml',
    );
    expect(plan.estimates).toHaveLength(1);
  });

  test('has a JSON Schema', () => {
    const schema = z.toJSONSchema(Estimates, { io: 'input', unrepresentable: 'any' });
    expect(schema.type).toBe('array');
  });
});

describe('a bad plan', () => {
  test.each([
    ['unknown key', one('    methd: ols\n'), 'unknown-key', '5:5', /'methd'.*did you mean 'method'/],
    ['unknown key at the top', 'estimate:\n  - name: A\n', 'unknown-key', '1:1', /did you mean 'estimates'/],
    ['unknown term', one('').replace('[x]', '[{sqare: x}]'), 'unknown-key', '4:19', /did you mean 'square'/],
    ['unknown method', one('    method: olss\n'), 'unknown-value', '5:13', /did you mean 'ols'/],
    ['unknown errors', one('    errors: robust-hc4\n'), 'unknown-value', '5:13', /did you mean 'robust-hc3'/],
    ['no outcome', 'estimates:\n  - name: A\n    covariates: [x]\n', 'missing-key', '2:5', /outcome is missing/],
    ['no name', 'estimates:\n  - outcome: y\n', 'missing-key', '2:5', /name is missing/],
    ['empty list', 'estimates: []\n', 'out-of-range', '1:12', /is empty/],
    ['bad draw', one('    draw: {places: 0, households_per_place: 3}\n'), 'out-of-range', '5:20', /at least 1/],
    [
      'unknown draw key',
      one('    draw: {place: 4, households_per_place: 3}\n'),
      'unknown-key',
      '5:12',
      /did you mean 'places'/,
    ],
    ['level out of range', one('    level: 95\n'), 'out-of-range', '5:12', /below 1/],
    [
      'iv without instruments',
      one('    method: iv\n    endogenous: [z]\n'),
      'no-instruments',
      '5:13',
      /no instruments/,
    ],
    ['ols with instruments', one('    instruments: [z]\n'), 'not-iv', '5:18', /belong to method iv/],
    ['clustered by nothing', one('    errors: clustered\n'), 'no-cluster', '5:13', /cluster by/],
    [
      'idle cluster',
      one('    errors: robust\n    cluster: [place]\n'),
      'idle-cluster',
      '5:13',
      /use errors: clustered/,
    ],
    ['three clusters', one('    cluster: [a, b, c]\n'), 'too-many-clusters', '5:14', /one or two/],
    ['hc3 with two effects', one('    errors: robust-hc3\n    effects: [a, b]\n'), 'hc3-effects', '5:13', /leverage/],
    ['same name twice', `${one('')}  - {name: A, outcome: y}\n`, 'duplicate-name', '5:12', /have this name/],
    ['dummy outcome', one('').replace('outcome: y', 'outcome: {dummy: g}'), 'dummy-outcome', '3:14', /0\/1 column/],
    ['not YAML', 'estimates: [\n', 'bad-yaml', '2:1', /not valid YAML/],
    ['empty', '', 'empty-plan', '1:1', /is empty/],
    ['a list', '- a\n', 'empty-plan', '1:1', /not a plan/],
  ])('%s', (_, text, code, at, message) => {
    const found = problems(text);
    expect(found.map((p) => p.code)).toContain(code);
    const problem = found.find((p) => p.code === code);
    expect(problem?.place).toBe(`plan.yaml:${at}`);
    expect(problem?.text).toMatch(message);
    // one mistake, one complaint
    expect(found).toHaveLength(1);
  });

  test('several mistakes come in file order', () => {
    const found = problems(one('    errors: robst\n    methd: ols\n    level: 2\n'));
    expect(found.map((p) => p.place)).toEqual(['plan.yaml:5:13', 'plan.yaml:6:5', 'plan.yaml:7:12']);
  });
});
