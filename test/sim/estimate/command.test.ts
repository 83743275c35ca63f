/** The built command on tables: what it prints, its exit status, and that a refused request writes nothing. */
import { readdirSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, test } from 'vitest';
import { rungsight, temporaryFolder } from '../command.js';

const folder = temporaryFolder();
writeFileSync(join(folder, 'survey.csv'), 'y,x,village\r\n1,1,a\r\n2,3,a\r\n2.5,4,b\r\n4,5,b\r\n3,7,c\r\n6,8,c\r\n');
writeFileSync(
  join(folder, 'plan.yaml'),
  'estimates:\n  - {name: Line, outcome: y, covariates: [x], cluster: [village]}\n',
);

describe('estimate --table', () => {
  test('--json prints the estimates alone', () => {
    const { status, out, err } = rungsight(
      ['estimate', '--table', 'survey.csv', '--plan', 'plan.yaml', '--json'],
      folder,
    );
    expect(err).toBe('');
    expect(status).toBe(0);
    const [estimate] = (JSON.parse(out) as { estimates: Record<string, unknown>[] }).estimates;
    expect(estimate).toMatchObject({ name: 'Line', nobs: 6, clusters: 3, within_r_squared: null });
    // least squares by hand: Σ(x−x̄)(y−ȳ)/Σ(x−x̄)²
    const x = [1, 3, 4, 5, 7, 8];
    const y = [1, 2, 2.5, 4, 3, 6];
    const mean = (v: number[]): number => v.reduce((s, a) => s + a, 0) / v.length;
    const slope =
      x.reduce((s, v, i) => s + (v - mean(x)) * (y[i] - mean(y)), 0) / x.reduce((s, v) => s + (v - mean(x)) ** 2, 0);
    const terms = estimate['terms'] as { term: string; estimate: number }[];
    expect(terms.map((t) => t.term)).toEqual(['(const)', 'x']);
    expect(terms[1].estimate).toBeCloseTo(slope, 12);
  });

  test('without it, a table to read', () => {
    const { status, out } = rungsight(['estimate', '--table', 'survey.csv', '--plan', 'plan.yaml'], folder);
    expect(status).toBe(0);
    expect(out).toContain('errors clustered by village (3)');
    expect(out).toContain('6 rows, R²');
  });

  test.each([
    [['estimate', '--plan', 'plan.yaml'], 'nothing to estimate from'],
    [['estimate', '.', '--table', 'survey.csv', '--plan', 'plan.yaml'], 'both given'],
    [['estimate', '--table', 'survy.csv', '--plan', 'plan.yaml'], 'there is no such table'],
    [['estimate', '--table', 'survey.csv', '--plan', 'plam.yaml'], 'there is no such plan'],
    [['estimate', 'nowhere', '--plan', 'plan.yaml'], 'nowhere'],
    [['estimate', '--table', 'survey.csv'], '--plan'],
  ])('%j has status 2', (args, message) => {
    const before = readdirSync(folder);
    const { status, err } = rungsight(args, folder);
    expect(status).toBe(2);
    expect(err).toContain(message);
    expect(err).not.toMatch(/^\s+at /m);
    expect(readdirSync(folder)).toEqual(before);
  });

  test('data that cannot carry the estimate: where, what, what to do', () => {
    writeFileSync(
      join(folder, 'bad.yaml'),
      'estimates:\n  - name: One\n    outcome: y\n    covariates: [x]\n    where: {village: a}\n    cluster: [village]\n',
    );
    const { status, err } = rungsight(['estimate', '--table', 'survey.csv', '--plan', 'bad.yaml'], folder);
    expect(status).toBe(2);
    expect(err.trim()).toBe(
      'bad.yaml:2:5 (One): all rows lie in one cluster of village; clustered errors need at least two, and about forty to be trusted: cluster by something finer',
    );
  });
});
