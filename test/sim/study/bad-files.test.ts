/**
 * Wrong data files, each with file, row and column. Nothing is simulated or written when one is found.
 */
import { describe, expect, test } from 'vitest';
import { InputError, describe as sentence } from '../../../network/errors.js';
import { loadInputs } from '../../../sim/study/inputs.js';
import { parseStudy } from '../../../sim/study/parse.js';

const STUDY = `study: From files
seed: files
generations: 2
population:
  households_file: h.csv
technology: {kind: linear, gross_return: 2}
preferences: {curvature: 0.6, child_weight: 0.3}
reference: {milestones: [{weight: 1, mix: [{from: neighbours, weight: 1}]}]}
arms:
  - name: a
    network: {kind: file, path: ties.csv}
`;

const HOUSEHOLDS = `household,wealth,place,group,x_schooling
h1,10,east,all,4
h2,20.5,east,all,
h3,3e1,west,all,7
h4,40,west,all,2
`;

const TIES = `source,target
h1,h2
h2,h3
h3,h4
`;

async function problems(files: Record<string, string>, study = STUDY): Promise<string[]> {
  try {
    await loadInputs(parseStudy(study, 's.yaml'), async (path) => files[path] ?? null);
  } catch (error) {
    if (error instanceof InputError) return error.problems.map(sentence);
    throw error;
  }
  return [];
}

const good = { 'h.csv': HOUSEHOLDS, 'ties.csv': TIES };

describe('right files', () => {
  test('are read: numbers, labels, covariates, ties by id', async () => {
    const inputs = await loadInputs(
      parseStudy(STUDY, 's.yaml'),
      async (path) => (good as Record<string, string>)[path] ?? null,
    );
    expect(Array.from(inputs.households!.wealth)).toEqual([10, 20.5, 30, 40]);
    expect(inputs.households!.placeNames).toEqual(['east', 'west']);
    expect(Array.from(inputs.households!.covariates[0]!.values as Float64Array)).toEqual([4, NaN, 7, 2]);
    expect(Array.from(inputs.ties['ties.csv']!.start)).toEqual([0, 1, 3, 5, 6]);
  });
});

describe('a wrong household file', () => {
  test.each([
    [
      'no wealth column',
      HOUSEHOLDS.replace('wealth', 'welth'),
      "h.csv:1: there is no column 'wealth'",
      "did you mean 'welth'?",
    ],
    ['no id column', HOUSEHOLDS.replace('household,', 'number,'), "there is no column 'household'", 'add the column'],
    [
      'a name column',
      HOUSEHOLDS.replace('x_schooling', 'headname'),
      "h.csv:1 column headname: unknown column 'headname'",
      'leave out names',
    ],
    [
      'wealth zero',
      HOUSEHOLDS.replace('20.5', '0'),
      "h.csv row 3 column wealth: wealth is '0'",
      'give a number above 0',
    ],
    [
      'negative wealth',
      HOUSEHOLDS.replace('20.5', '-5'),
      "h.csv row 3 column wealth: wealth is '-5'",
      'give a number above 0',
    ],
    ['a decimal comma', HOUSEHOLDS.replace('20.5', '"20,5"'), "wealth is '20,5'", 'with a point as decimal mark'],
    ['thousands separators', HOUSEHOLDS.replace('20.5', '"1,020"'), "wealth is '1,020'", 'no separators'],
    ['empty wealth', HOUSEHOLDS.replace('20.5', ''), 'h.csv row 3 column wealth: wealth is empty', 'give a number'],
    ['a word for wealth', HOUSEHOLDS.replace('20.5', 'NA'), "wealth is 'NA'", 'give a number'],
    [
      'an id twice',
      HOUSEHOLDS.replace('h3', 'h1'),
      "h.csv row 4 column household: household 'h1' stands in row 2 too",
      'keep one row',
    ],
    [
      'an empty id',
      HOUSEHOLDS.replace('h3', ''),
      'h.csv row 4 column household: the id is empty',
      'give every household an id',
    ],
    [
      'an empty place',
      HOUSEHOLDS.replace('3e1,west', '3e1,'),
      'h.csv row 4 column place: place is empty',
      'give every household a place',
    ],
    ['one household', 'household,wealth\nh1,5\n', 'h.csv: there is one household', 'give at least two'],
    ['no rows', 'household,wealth\n', 'h.csv', ''],
    ['an empty file', '', 'h.csv', 'empty'],
    ['a short row', HOUSEHOLDS.replace('h3,3e1,west,all,7', 'h3,3e1'), 'h.csv', '4'],
    ['an open quote', HOUSEHOLDS.replace('h3', '"h3'), 'h.csv', 'quote'],
  ])('%s', async (_what, file, expected, also) => {
    const text = (await problems({ ...good, 'h.csv': file })).join('\n');
    expect(text).toContain(expected);
    expect(text).toContain(also);
  });

  test('a file that is not there is told with its place in the study', async () => {
    expect(await problems({ 'ties.csv': TIES })).toEqual([
      "s.yaml:5:20: file 'h.csv' was not found; give its path relative to the study file",
    ]);
  });

  test('thousands of faults are told as a few and a count', async () => {
    const rows = Array.from({ length: 5000 }, (_, i) => `h${i},x`).join('\n');
    const found = await problems({ ...good, 'h.csv': `household,wealth\n${rows}\n` });
    expect(found.length).toBe(21);
    expect(found.at(-1)).toContain('4980 more problems');
  });

  test('a group nobody is in', async () => {
    const study = STUDY.replace(
      'households_file: h.csv',
      'households_file: h.csv\n  groups: [{name: al, preferences: {child_weight: 0.5}}]',
    );
    expect((await problems(good, study)).join()).toContain(
      "s.yaml:6:19: no household of the file is in group 'al'; did you mean 'all'?",
    );
  });
});

describe('a wrong tie file', () => {
  test.each([
    ['an unknown id', TIES.replace('h3,h4', 'h3,h9'), 'ties.csv:4', 'h9'],
    ['a loop', TIES.replace('h3,h4', 'h3,h3'), 'ties.csv:4', 'h3'],
    ['a tie twice', `${TIES}h1,h2\n`, 'ties.csv:5', 'h1'],
    ['a tie twice, the other way round', `${TIES}h2,h1\n`, 'ties.csv:5', 'h2'],
    ['a wrong header', TIES.replace('source,target', 'from,to'), 'ties.csv:1', 'source'],
    ['a negative weight', 'source,target,weight\nh1,h2,-1\n', 'ties.csv:2', '-1'],
    ['a weight that is no number', 'source,target,weight\nh1,h2,strong\n', 'ties.csv:2', 'strong'],
    ['a missing weight', 'source,target,weight\nh1,h2,\n', 'ties.csv:2', 'weight'],
    ['one end missing', 'source,target\nh1,\n', 'ties.csv:2', ''],
    ['an empty file', '', 'ties.csv', 'empty'],
  ])('%s', async (_what, file, place, also) => {
    const text = (await problems({ ...good, 'ties.csv': file })).join('\n');
    expect(text).toContain(place);
    expect(text).toContain(also);
    expect(text).toMatch(/; .+/);
  });
});

describe('a wrong GraphML file', () => {
  const study = STUDY.replace('ties.csv', 'ties.graphml');
  const graph = (inside: string, directed = 'undirected'): string =>
    `<?xml version="1.0"?>\n<graphml xmlns="http://graphml.graphdrawing.org/xmlns">\n<graph edgedefault="${directed}">\n${inside}\n</graph>\n</graphml>\n`;
  const nodes = '<node id="h1"/><node id="h2"/><node id="h3"/><node id="h4"/>';

  test('a right one is read', async () => {
    expect(
      await problems({ ...good, 'ties.graphml': graph(`${nodes}<edge source="h1" target="h2"/>`) }, study),
    ).toEqual([]);
  });

  test.each([
    ['directed ties', graph(`${nodes}<edge source="h1" target="h2"/>`, 'directed'), 'directed'],
    ['an unknown household', graph(`${nodes}\n<edge source="h1" target="h7"/>`), 'h7'],
    ['a loop', graph(`${nodes}\n<edge source="h1" target="h1"/>`), 'h1'],
    ['a broken tag', graph(`${nodes}<edge source="h1" target="h2"`), 'ties.graphml'],
    ['not XML at all', 'source,target\nh1,h2\n', 'ties.graphml'],
  ])('%s', async (_what, file, expected) => {
    const text = (await problems({ ...good, 'ties.graphml': file }, study)).join('\n');
    expect(text).toContain('ties.graphml');
    expect(text).toContain(expected);
  });
});
