import { describe, expect, test } from 'vitest';
import { parseStudy } from '../../../sim/study/parse.js';
import { readingOf, roleLooks } from '../../../viewer/sheet/reading.js';
import { SAMPLE } from './sample.js';

const facts = (reading: ReturnType<typeof readingOf>): Record<string, string> =>
  Object.fromEntries(reading.facts.map(({ label, says }) => [label, says]));
const people = 'household,wealth,place,group,x_age,x_crop\na,10,n,up,30,rice\nb,20,n,up,,maize\nc,40,s,down,50,rice\n';

test.each([
  ['a.yaml', '', 'study'],
  ['a.graphml', '', 'ties'],
  ['a.csv', '"source","target",weight\n', 'ties'],
  ['a.csv', 'household, wealth\n', 'households'],
  ['a.csv', 'id,assets\n', 'survey'],
  ['a.txt', '', 'unknown'],
])('%s beginning %j looks like %s', (name, text, role) => {
  expect(roleLooks(name, text)).toBe(role);
});

describe('what was read', () => {
  test('from households: rows, ranges, places, groups, covariates', () => {
    const reading = readingOf('people.csv', people, null);
    expect(reading.problems).toEqual([]);
    expect(facts(reading)).toEqual({
      households: '3 rows',
      wealth: '10 to 40, median 20',
      places: '2 (n, s)',
      groups: 'up 2, down 1',
      x_age: '30 to 50, median 30; 1 row empty',
      x_crop: 'text: rice, maize',
    });
  });

  test('from ties, against the households the study names', () => {
    const study = parseStudy(
      SAMPLE.replace(/ {2}households: 300[\s\S]*?between_places: 0.4\n/, '  households_file: people.csv\n').replace(
        '{kind: blocks, mean_degree: 10, within_place: 0.9, within_group: 0.8}',
        '{kind: file, path: ties.csv}',
      ),
      'study',
    ).study;
    const reading = readingOf('ties.csv', 'source,target,weight\na,b,2\n', study, new Map([['people.csv', people]]));
    expect(reading).toMatchObject({ role: 'ties', used: true });
    expect(facts(reading)).toMatchObject({
      ties: '1 tie between 3 households',
      'without ties': '1 household',
      weights: '2 throughout',
    });
    const wrong = readingOf('ties.csv', 'source,target\na,z\n', study, new Map([['people.csv', people]]));
    expect(wrong.facts).toEqual([]);
    expect(wrong.problems[0]!.place).toMatch(/^ties\.csv/);
    expect(wrong.problems[0]!.problem).toContain('"z"');
  });

  test('from ties without a study: rows and columns', () => {
    expect(facts(readingOf('ties.csv', 'source,target\na,b\nb,c\n', null))).toMatchObject({ rows: '2 ties' });
  });

  test('a faulty file gives its problems, place by place', () => {
    const reading = readingOf('people.csv', 'household,wealth\na,ten\n\nb,0\n', null);
    expect(reading.problems.map(({ place }) => place)).toEqual([
      'people.csv row 2 column wealth',
      expect.stringContaining('column wealth'),
    ]);
  });

  test('a file of no known kind is said to be none', () => {
    expect(readingOf('notes.txt', 'hello', null).problems[0]!.problem).toContain('neither');
  });
});
