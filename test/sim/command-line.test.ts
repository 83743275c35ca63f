/**
 * The command line as a user meets it: results on standard output, errors on standard error with place and remedy,
 * exit statuses, and nothing written when the request was wrong.
 */
import { existsSync, mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, test } from 'vitest';
import { rungsight, temporaryFolder } from './command.js';

const folder = temporaryFolder();
const run = (...args: string[]) => rungsight(args, folder);

const STUDY = `study: Small
seed: small
generations: 2
population:
  households: 60
  places: 3
  wealth: {shape: lognormal, mean: 10, gini: 0.3}
technology: {kind: linear, gross_return: 2.5}
preferences: {curvature: 0.6, child_weight: 0.35}
reference: {milestones: [{weight: 0.6, mix: [{from: neighbours, weight: 1}]}]}
arms:
  - name: apart
    network: {kind: blocks, mean_degree: 6, within_place: 0.8}
  - name: mixed
    network: {from: apart, mixing: {share: 1}}
`;

beforeAll(() => writeFileSync(join(folder, 's.yaml'), STUDY));

describe('wrong requests', () => {
  test.each<[string, string[], RegExp]>([
    ['an unknown command', ['rnu'], /^rungsight: unknown command 'rnu'; did you mean run\?/],
    [
      'an unknown option',
      ['run', '--thread', '2', 's.yaml'],
      /^rungsight run: unknown option '--thread'; did you mean --threads\?/,
    ],
    ['no study', ['run'], /^run: no study was named; give a study file or a built-in study/],
    ['a study that is not there', ['run', 'no.yaml'], /^no\.yaml: there is no such study file; /],
    ['a mistyped preset', ['run', 'village-apart'], /did you mean the built-in study 'villages-apart'\?/],
    [
      'threads that are no number',
      ['run', 's.yaml', '--threads', 'two'],
      /^--threads: 'two' is not a whole number of at least 1; /,
    ],
    ['resume of nothing', ['run', '--resume', 'nothing'], /^nothing: no unfinished run is there/],
    ['a folder for a study', ['check', '.'], /^\.: this is a folder, not a study file; /],
    [
      'a preset that is not there',
      ['presets', 'valleys'],
      /^valleys: there is no built-in study of this name; use one of /,
    ],
    ['a network kind that is not there', ['network', 'build', 'blocs'], /did you mean 'blocks'\?/],
    [
      'a network key out of range',
      ['network', 'build', 'ring', '--set', 'degree=4', 'rewire=2'],
      /^--set: rewire is 2; give a number at most 1/,
    ],
    [
      'ties and summary to one output',
      ['network', 'build', 'random', '--set', 'mean_degree=3', '--json'],
      /^--json: the ties and the summary cannot both go to standard output; add --out FILE/,
    ],
    [
      'a graph that is not there',
      ['network', 'measure', 'none.csv'],
      /^none\.csv: there is no such file; check the path/,
    ],
    ['mixing by nothing', ['network', 'mix', 's.yaml'], /neither --share nor --target is given; give one of them/],
  ])('%s', (_what, args, expected) => {
    const before = readdirSync(folder);
    const ran = run(...args);
    expect(ran.status).toBe(2);
    expect(ran.err).toMatch(expected);
    expect(ran.err).not.toMatch(/\n\s+at /);
    if (!args.includes('--json')) expect(ran.out).toBe('');
    expect(readdirSync(folder)).toEqual(before);
  });

  test('a target that cannot be reached is told at its line, and nothing is left behind', () => {
    writeFileSync(join(folder, 'far.yaml'), STUDY.replace('{share: 1}', '{target: assortativity, value: 1}'));
    const ran = run('run', 'far.yaml', '--out', 'far');
    expect(ran.status).toBe(2);
    expect(ran.err).toMatch(
      /far\.yaml:15:\d+: assortativity 1 is out of reach with these degrees: it started at .*; ask for .*, or set best_effort: true/,
    );
    expect(existsSync(join(folder, 'far'))).toBe(false);
    expect(existsSync(join(folder, 'far.partial'))).toBe(false);
  });

  test('errors come as data with --json', () => {
    const ran = run('check', 'no.yaml', '--json');
    expect(ran.status).toBe(2);
    expect((JSON.parse(ran.out) as { errors: { code: string; place: string }[] }).errors[0]).toMatchObject({
      code: 'no-such-file',
      place: 'no.yaml',
    });
  });
});

describe('odd studies', () => {
  test('villages of very uneven size run: the smallest have what ties they can', () => {
    const text = STUDY.replace('households: 60', 'households: 150')
      .replace('places: 3', 'places: {count: 6, size_cv: 0.6}')
      .replace('within_place: 0.8', 'within_place: 0.9')
      .replace('generations: 2', 'generations: 1\nreplicates: 12');
    writeFileSync(join(folder, 'uneven.yaml'), text);
    expect(run('run', 'uneven.yaml', '--out', 'uneven').status).toBe(0);
  });

  test('pockets that were not tested are not called chance, and no file is named that is not there', () => {
    const text = `${STUDY.replace('households: 60', 'households: 300').replace('generations: 2', 'generations: 4')}pockets: {permutations: 0, min_size: 2}\nkeep: {panel: none}\n`;
    writeFileSync(join(folder, 'untested.yaml'), text);
    const ran = run('run', 'untested.yaml', '--out', 'untested');
    expect(ran.status).toBe(0);
    expect(ran.out).not.toContain('none larger than chance');
    expect(ran.out).not.toContain('panel.parquet');
  });
});

describe('every command explains itself', () => {
  test.each([
    ['run'],
    ['check'],
    ['presets'],
    ['view'],
    ['estimate'],
    ['network', 'build'],
    ['network', 'mix'],
    ['network', 'measure'],
  ])('%s %s', (...words) => {
    const ran = run(...words.filter((word) => word !== undefined), '--help');
    expect(ran.status).toBe(0);
    expect(ran.out).toMatch(/Examples?:\n {2}rungsight /);
  });
});

describe('check', () => {
  test('says what a run would need and writes nothing', () => {
    const before = readdirSync(folder);
    const ran = run('check', 's.yaml', '--json');
    expect(ran.status).toBe(0);
    const needs = JSON.parse(ran.out) as Record<string, number>;
    expect(needs['household_generations']).toBe(240);
    for (const key of ['memory_bytes', 'disk_bytes', 'seconds']) expect(needs[key]).toBeGreaterThan(0);
    expect(readdirSync(folder)).toEqual(before);
  });

  test('its estimate of disk is near what the run writes', () => {
    const text = STUDY.replace('households: 60', 'households: 2000').replace(
      'generations: 2',
      'generations: 6\nreplicates: 3',
    );
    writeFileSync(join(folder, 'larger.yaml'), text);
    const needs = JSON.parse(run('check', 'larger.yaml', '--json').out) as { disk_bytes: number };
    expect(run('run', 'larger.yaml', '--out', 'larger').status).toBe(0);
    const manifest = JSON.parse(readFileSync(join(folder, 'larger', 'manifest.json'), 'utf8')) as {
      files: { bytes: number }[];
    };
    const written = manifest.files.reduce((sum, file) => sum + file.bytes, 0);
    // a trial of three generations cannot know more: half to twice is what a user can plan with
    expect(needs.disk_bytes / written).toBeGreaterThan(0.5);
    expect(needs.disk_bytes / written).toBeLessThan(2);
  });
});

describe('presets', () => {
  test('are listed, written out with their files, and never over another file', () => {
    expect(run('presets').out).toMatch(/^villages-apart +Villages apart$/m);
    mkdirSync(join(folder, 'mine'));
    expect(run('presets', 'villages-apart', '--out', 'mine').status).toBe(0);
    expect(run('check', join('mine', 'villages-apart.yaml')).status).toBe(0);
    const again = run('presets', 'villages-apart', '--out', 'mine');
    expect(again.status).toBe(2);
    expect(again.err).toContain('this file exists and would be overwritten');
  });
});

describe('network', () => {
  test('builds, mixes and measures through files', () => {
    const built = run(
      'network',
      'build',
      'blocks',
      '--households',
      '400',
      '--places',
      '8',
      '--groups',
      '0.5,0.5',
      '--set',
      'mean_degree=8',
      'within_place=0.9',
      '--out',
      'g.graphml',
      '--json',
    );
    expect(built.status).toBe(0);
    expect((JSON.parse(built.out) as { within_place: number }).within_place).toBeCloseTo(0.9, 1);
    const measure = (graph: string): Record<string, number> =>
      JSON.parse(run('network', 'measure', graph, '--value', 'wealth', '--by', 'place', '--json').out) as Record<
        string,
        number
      >;
    const apart = measure('g.graphml');
    expect(apart['households']).toBe(400);
    expect(apart['assortativity_group']).toBeGreaterThan(0.8);
    expect(run('network', 'mix', 'g.graphml', '--share', '1', '--out', 'm.graphml').status).toBe(0);
    const mixed = measure('m.graphml');
    expect(mixed['ties']).toBe(apart['ties']);
    expect(mixed['max_degree']).toBe(apart['max_degree']);
    // a random graph of 400 households has |assortativity| below a few times 1/√ties = 0.025
    expect(Math.abs(mixed['assortativity_group']!)).toBeLessThan(0.1);
    expect(Object.keys(mixed)).toEqual([
      'households',
      'ties',
      'isolates',
      'components',
      'largest_component',
      'mean_degree',
      'max_degree',
      'transitivity',
      'average_clustering',
      'assortativity_degree',
      'assortativity_value',
      'moran',
      'moran_expected',
      'moran_p',
      'assortativity_group',
      'modularity',
      'e_i_group',
      'coleman_group',
    ]);
  });
});
