import { describe, expect, test } from 'vitest';
import type { InputError } from '../../../network/errors.js';
import { type Column, type Frame, frameSource, numberColumn, textColumn } from '../../../sim/estimate/frame.js';
import { estimatesCsv, estimatesJson } from '../../../sim/estimate/output.js';
import { parsePlan } from '../../../sim/estimate/plan.js';
import { planText } from '../../../sim/estimate/print.js';
import { type PlanResults, runEstimates } from '../../../sim/estimate/run.js';
import { luck } from './samples.js';

const HOUSEHOLDS = 60;
const PLACES = 12;
const GENERATIONS = 4;

/** A panel of two arms and some replicates, by formula and seeded luck; growth falls by 0.2 in the mixed arm. */
function panel(replicates = 1): Frame {
  const { normal } = luck('panel');
  const arm: string[] = [];
  const group: (string | null)[] = [];
  const numbers: Record<string, number[]> = {
    replicate: [],
    generation: [],
    household: [],
    place: [],
    wealth: [],
    growth: [],
    gap: [],
  };
  for (const a of ['segregated', 'mixed']) {
    for (let r = 0; r < replicates; r++) {
      for (let t = 0; t < GENERATIONS; t++) {
        for (let h = 0; h < HOUSEHOLDS; h++) {
          arm.push(a);
          group.push(h === 7 ? null : h % 3 === 0 ? 'upland' : 'lowland');
          const gap = normal();
          const row: Record<string, number> = {
            replicate: r,
            generation: t,
            household: h,
            place: h % PLACES,
            wealth: 100 * t + h + 1,
            gap: h === 3 && t === 0 ? NaN : gap,
            growth: 1 + 0.5 * gap - (a === 'mixed' ? 0.2 : 0) + 0.1 * normal(),
          };
          for (const [name, v] of Object.entries(row)) numbers[name].push(v);
        }
      }
    }
  }
  const columns = new Map<string, Column>([
    ['arm', textColumn(arm)],
    ['group', textColumn(group)],
  ]);
  for (const [name, values] of Object.entries(numbers)) columns.set(name, numberColumn(Float64Array.from(values)));
  return { rows: arm.length, columns };
}

async function run(yaml: string, frame = panel()): Promise<PlanResults> {
  const plan = parsePlan(yaml, 'plan.yaml');
  return runEstimates(plan.estimates, frameSource(frame, 'memory', 'seed'), plan.place, { seed: plan.seed });
}

async function problemsOf(yaml: string, frame = panel()): Promise<InputError['problems']> {
  try {
    await run(yaml, frame);
  } catch (error) {
    return (error as InputError).problems;
  }
  return [];
}

const one = (lines: string): string => `estimates:\n  - name: A\n    outcome: growth\n${lines}`;

describe('arms and replicates', () => {
  test('an estimate runs for each arm and replicate', async () => {
    const { estimates, summary } = await run(one('    covariates: [gap]\n    truth: {gap: 0.5}\n'), panel(3));
    expect(estimates.map((e) => [e.arm, e.replicate])).toEqual([
      ['segregated', 0],
      ['segregated', 1],
      ['segregated', 2],
      ['mixed', 0],
      ['mixed', 1],
      ['mixed', 2],
    ]);
    expect(summary.map((s) => s.arm)).toEqual(['segregated', 'mixed']);
    const slope = summary[0].terms[1];
    const b = estimates.slice(0, 3).map((e) => e.terms[1].estimate);
    expect(slope.mean).toBeCloseTo((b[0] + b[1] + b[2]) / 3, 12);
    expect(slope.sd).toBeCloseTo(Math.sqrt(b.reduce((s, v) => s + (v - slope.mean) ** 2, 0) / 2), 12);
    expect(slope.rejects_zero).toBe(1);
    expect(slope.bias).toBeCloseTo(slope.mean - 0.5, 12);
    expect(slope.coverage).not.toBeNull();
  });

  test('where on arm picks arms; an arm that is not there is refused', async () => {
    const { estimates } = await run(one('    covariates: [gap]\n    where: {arm: [mixed]}\n'));
    expect(estimates.map((e) => e.arm)).toEqual(['mixed']);
    const [problem] = await problemsOf(one('    covariates: [gap]\n    where: {arm: [mixt]}\n'));
    expect(problem.code).toBe('unknown-arm');
    expect(problem.place).toBe('plan.yaml:5:18');
  });

  test('{dummy: arm} pools the arms, the first arm being the base', async () => {
    const { estimates } = await run(one('    covariates: [{dummy: arm}, gap]\n    cluster: [place]\n'));
    expect(estimates).toHaveLength(1);
    expect(estimates[0].arm).toBe('segregated + mixed');
    const effect = estimates[0].terms[1];
    expect(effect.term).toBe('arm=mixed');
    // noise of 0.1 over 480 rows
    expect(Math.abs(effect.estimate + 0.2)).toBeLessThan(0.05);
    // a place is one cluster over both arms: its households share their luck
    expect(estimates[0].clusters).toBe(PLACES);
  });
});

describe('terms', () => {
  test('lags and leads are the same household’s, in its arm and replicate, also past the filter', async () => {
    const { estimates } = await run(
      `estimates:
  - {name: lag, outcome: wealth, covariates: [{lag: wealth}], where: {generation: [1, 1]}}
  - {name: lead, outcome: {lead: wealth}, covariates: [wealth], where: {generation: [0, 3]}}
`,
      panel(2),
    );
    for (const e of estimates) {
      // wealth rises by 100 a generation exactly
      expect(e.terms[0].estimate).toBeCloseTo(100, 6);
      expect(e.terms[1].estimate).toBeCloseTo(1, 9);
    }
    expect(estimates.find((e) => e.name === 'lag')?.nobs).toBe(HOUSEHOLDS);
    const lead = estimates.find((e) => e.name === 'lead');
    expect(lead?.nobs).toBe(HOUSEHOLDS * 3);
    expect(lead?.missing).toEqual({ 'lead(wealth)': HOUSEHOLDS });
  });

  test('names, and values of nested terms', async () => {
    const { estimates } = await run(
      one(
        '    covariates: [log_wealth, {square: {log: wealth}}, {product: [{dummy: group}, {power: [gap, 3]}]}]\n    where: {arm: mixed}\n',
      ),
    );
    expect(estimates[0].terms.map((t) => t.term)).toEqual([
      '(const)',
      'log_wealth',
      'square(log_wealth)',
      'product(group=upland, power(gap, 3))',
    ]);
  });

  test('dummies: alphabetical, the base as asked', async () => {
    const first = await run(one('    covariates: [{dummy: group}]\n    where: {arm: mixed}\n'));
    expect(first.estimates[0].terms[1].term).toBe('group=upland');
    const other = await run(one('    covariates: [{dummy: group, base: upland}]\n    where: {arm: mixed}\n'));
    expect(other.estimates[0].terms[1].term).toBe('group=lowland');
    expect(other.estimates[0].terms[1].estimate).toBeCloseTo(-first.estimates[0].terms[1].estimate, 10);
  });

  test('missing values: rows dropped, counted by column', async () => {
    const { estimates } = await run(one('    covariates: [gap, {dummy: group}]\n    where: {arm: mixed}\n'));
    const rows = HOUSEHOLDS * GENERATIONS;
    expect(estimates[0].rows_chosen).toBe(rows);
    expect(estimates[0].missing).toEqual({ gap: 1, 'group=upland': GENERATIONS });
    expect(estimates[0].nobs).toBe(rows - 1 - GENERATIONS);
    expect(estimates[0].households).toBe(HOUSEHOLDS - 1);
  });

  test('filters: value, range, open range, list of texts, {in: …}', async () => {
    const count = async (where: string): Promise<number> =>
      (await run(one(`    covariates: [wealth]\n    where: {arm: mixed, ${where}}\n`))).estimates[0].nobs;
    expect(await count('generation: 2')).toBe(HOUSEHOLDS);
    expect(await count('generation: [1, 2]')).toBe(2 * HOUSEHOLDS);
    expect(await count('generation: {from: 2}')).toBe(2 * HOUSEHOLDS);
    expect(await count('place: {in: [0, 5, 7]}')).toBe((3 * HOUSEHOLDS * GENERATIONS) / PLACES);
    expect(await count('place: [0, 5, 7]')).toBe((3 * HOUSEHOLDS * GENERATIONS) / PLACES);
    expect(await count('group: [upland, lowland]')).toBe((HOUSEHOLDS - 1) * GENERATIONS);
  });

  test.each([
    ['covariates: [gapp]', 'unknown-column', /did you mean 'gap'/],
    ['covariates: [log_welth]', 'unknown-column', /did you mean 'log_wealth'/],
    ['covariates: [group]', 'text-term', /\{dummy: group\}/],
    ['covariates: [{dummy: grup}]', 'unknown-column', /did you mean 'group'/],
    ['effects: [plase]', 'unknown-column', /did you mean 'place'/],
    ['cluster: [plase]', 'unknown-column', /did you mean 'place'/],
    ['where: {groop: upland}', 'unknown-column', /did you mean 'group'/],
    ['where: {group: 3}', 'wrong-type', /is text/],
    ['where: {place: north}', 'wrong-type', /is a number/],
  ])('%s is refused', async (line, code, message) => {
    const text = one(`    ${line}\n`);
    const problems = await problemsOf(text);
    expect(problems).toHaveLength(1);
    expect(problems[0].code).toBe(code);
    expect(problems[0].place).toMatch(/^plan\.yaml:4:\d+$/);
    expect(`${problems[0].problem}; ${problems[0].remedy}`).toMatch(message);
  });

  test('a dummy for each of very many values is refused: absorbing does it', async () => {
    const n = 20_000;
    const columns = new Map<string, Column>([
      ['y', numberColumn(Float64Array.from({ length: n }, (_, i) => i % 7))],
      ['id', numberColumn(Float64Array.from({ length: n }, (_, i) => i >> 1))],
    ]);
    const problems = await problemsOf('estimates: [{name: A, outcome: y, covariates: [{dummy: id}]}]', {
      rows: n,
      columns,
    });
    expect(problems[0].code).toBe('too-many-dummies');
    expect(problems[0].remedy).toContain('effects: [id]');
  });

  test('a lag needs to know who and when', async () => {
    const frame = panel();
    const columns = new Map(frame.columns);
    columns.delete('generation');
    const problems = await problemsOf(one('    covariates: [{lag: gap}]\n'), { rows: frame.rows, columns });
    expect(problems[0].code).toBe('missing-column');
  });
});

describe('survey draws', () => {
  const plan = one('    covariates: [gap]\n    draw: {places: 5, households_per_place: 3}\n');

  test('take the places and households asked for, whole dynasties, the same in both arms', async () => {
    const { estimates, draws } = await run(plan, panel(2));
    for (const e of estimates) {
      expect(e.households).toBe(15);
      expect(e.rows_chosen).toBe(15 * GENERATIONS);
    }
    for (const { households } of draws) {
      const places = households.map((h) => h % PLACES);
      expect(new Set(places).size).toBe(5);
    }
    const of = (arm: string, replicate: number) =>
      draws.find((d) => d.arm === arm && d.replicate === replicate)?.households;
    expect(of('segregated', 0)).toEqual(of('mixed', 0));
    expect(of('segregated', 0)).not.toEqual(of('segregated', 1));
  });

  test('depend on the seed and on nothing else', async () => {
    expect(await run(plan)).toEqual(await run(plan));
    const other = await run(`seed: other\n${plan}`);
    expect(other.draws[0].households).not.toEqual((await run(plan)).draws[0].households);
  });

  test('every household is as likely as another', async () => {
    const { draws } = await run(
      one('    covariates: [wealth]\n    draw: {places: 6, households_per_place: 2}\n    where: {arm: mixed}\n'),
      panel(100),
    );
    const times = new Float64Array(HOUSEHOLDS);
    for (const { households } of draws) for (const h of households) times[h]++;
    // 12 of 60 in each of 100 draws: 20 on average, sd 4; five sd
    for (const t of times) expect(Math.abs(t - 20)).toBeLessThan(20);
    expect(times.reduce((s, t) => s + t, 0)).toBe(1200);
  });

  test('more places than there are is refused; fewer households than asked for is said', async () => {
    const many = await problemsOf(one('    covariates: [gap]\n    draw: {places: 13, households_per_place: 2}\n'));
    expect(many[0].code).toBe('too-few-places');
    const { estimates } = await run(one('    covariates: [gap]\n    draw: {places: 12, households_per_place: 99}\n'));
    expect(estimates[0].notes[0]).toContain('12 of the 12 places drawn have fewer than 99 households');
  });
});

describe('failures', () => {
  test('an estimate that fails everywhere is an error, with its place, arm and name', async () => {
    const problems = await problemsOf(one('    covariates: [gap]\n    where: {wealth: {from: 1e9}}\n'));
    expect(problems.map((p) => p.code)).toEqual(['empty-sample', 'empty-sample']);
    expect(problems[0].place).toBe('plan.yaml:2:5 (A, arm segregated)');
  });

  test('one that fails in some replicates is listed and left out of the summary', async () => {
    const frame = panel(3);
    const growth = frame.columns.get('growth') as { values: Float64Array };
    const replicate = frame.columns.get('replicate') as { values: Float64Array };
    growth.values.forEach((_, i) => {
      if (replicate.values[i] === 1) growth.values[i] = 1;
    });
    const { estimates, failed, summary } = await run(one('    covariates: [gap]\n'), frame);
    expect(estimates).toHaveLength(4);
    expect(failed.map((f) => [f.code, f.arm, f.replicate])).toEqual([
      ['no-variation', 'segregated', 1],
      ['no-variation', 'mixed', 1],
    ]);
    expect(summary[0]).toMatchObject({ replicates: 2, failed: 1 });
  });
});

describe('output', () => {
  test('JSON has the keys scripts read; CSV has a row a term; the text names every term', async () => {
    const results = await run(
      one('    covariates: [gap]\n    effects: [place]\n    cluster: [place]\n    where: {arm: mixed}\n'),
    );
    const json = JSON.parse(estimatesJson(results)) as { estimates: Record<string, unknown>[] };
    const [e] = json.estimates;
    for (const key of ['name', 'terms', 'nobs', 'clusters', 'r_squared', 'within_r_squared', 'diagnostics'])
      expect(e).toHaveProperty(key);
    expect(Object.keys((e['terms'] as object[])[0])).toEqual([
      'term',
      'estimate',
      'std_error',
      'statistic',
      'p_value',
      'ci_low',
      'ci_high',
    ]);
    expect(e['clusters']).toBe(PLACES);
    const lines = estimatesCsv(results).trimEnd().split('\r\n');
    expect(lines).toHaveLength(2);
    expect(Number(lines[1].split(',')[7])).toBe(results.estimates[0].terms[0].estimate);
    const text = planText(results);
    expect(text).toContain('errors clustered by place (12), effects of place (12) absorbed');
    expect(text).toContain('Only 12 clusters of place');
  });
});
