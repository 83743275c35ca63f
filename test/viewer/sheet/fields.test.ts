import { describe, expect, test } from 'vitest';
import { parse } from 'yaml';
import { StudyFile } from '../../../sim/study/schema.js';
import { type Field, fieldAt, fieldOf, type GroupField, rangeWords, variantAt } from '../../../viewer/sheet/fields.js';
import { QUESTIONS } from '../../../viewer/sheet/words.js';
import { SAMPLE } from './sample.js';

const root = fieldOf(StudyFile) as GroupField;
const study = parse(SAMPLE) as unknown;

/** Every field with the keys that lead to it. */
function all(field: Field, path: string): [string, Field][] {
  const inner =
    field.kind === 'group'
      ? field.fields.flatMap((one) => all(one, `${path}.${one.key}`))
      : field.kind === 'list'
        ? all(field.item, `${path}[]`)
        : field.kind === 'union'
          ? field.variants.flatMap(({ name, field: one }) =>
              one.kind === 'group' ? one.fields.flatMap((own) => all(own, `${path}<${name}>.${own.key}`)) : [],
            )
          : [];
  return [[path, field], ...inner];
}

describe('the fields of the study schema', () => {
  test('every setting with a key has a title and one sentence that ends', () => {
    const silent = all(root, 'study')
      .filter(([, { key }]) => key !== '')
      .filter(([, { title, sentence }]) => title === '' || !/^[^\s].*[.]$/.test(sentence))
      .map(([path]) => path);
    expect(silent).toEqual([]);
  });

  test('every section belongs to exactly one question', () => {
    const asked = QUESTIONS.flatMap(({ keys }) => keys);
    expect([...asked].sort()).toEqual(root.fields.map(({ key }) => key).sort());
    const inText = QUESTIONS.flatMap((question) => question.inText ?? []);
    expect([...asked, ...inText].sort()).toEqual(Object.keys(StudyFile.shape).sort());
  });

  test('bounds, defaults and usual ranges come over', () => {
    expect(fieldAt(root, ['preferences', 'child_weight_spread'], study)).toMatchObject({
      kind: 'number',
      least: 0,
      most: 3,
      fallback: 0,
      optional: true,
      usual: '0 to 0.5',
    });
    expect(fieldAt(root, ['generations'], study)).toMatchObject({
      whole: true,
      least: 1,
      most: 10_000,
      optional: false,
    });
  });

  test('a seed is one text field, a panel four alternatives', () => {
    expect(fieldAt(root, ['seed'], study)).toMatchObject({ kind: 'text' });
    const panel = fieldAt(root, ['keep', 'panel'], study);
    expect(panel?.kind === 'union' && panel.variants.map(({ name }) => name)).toEqual(['all', 'none', 'replicates']);
  });

  test('networks are one list of alternatives, those of another arm among them', () => {
    const network = fieldAt(root, ['arms', 0, 'network'], study);
    if (network?.kind !== 'union') throw new Error('not a union');
    expect(network.variants.map(({ name }) => name)).toEqual([
      'blocks',
      'similarity',
      'ring',
      'random',
      'preferential',
      'spatial',
      'configuration',
      'file',
      'named',
      'from',
    ]);
    expect(variantAt(network, { kind: 'ring', degree: 4 })?.name).toBe('ring');
    expect(variantAt(network, { from: 'segregated' })?.name).toBe('from');
    expect(variantAt(network, { kind: 'rung' })).toBeNull();
    expect(variantAt(network, undefined)).toBeNull();
  });

  test('fields below an alternative are found by what the study says', () => {
    expect(fieldAt(root, ['arms', 0, 'network', 'mean_degree'], study)).toMatchObject({ title: 'Ties each' });
    expect(fieldAt(root, ['arms', 1, 'network', 'mixing', 'share'], study)).toMatchObject({ title: 'Share swapped' });
    expect(fieldAt(root, ['arms', 0, 'network', 'mixing'], study)).toBeNull();
    expect(fieldAt(root, ['reference', 'milestones', 0, 'mix', 1, 'statistic'], study)).toMatchObject({
      kind: 'choice',
    });
  });

  test.each([
    [{ least: 0, most: 1 }, '0 to 1'],
    [{ least: 0, aboveLeast: true }, 'above 0'],
    [{ least: 0, most: 1, aboveLeast: true, belowMost: true }, 'above 0, below 1'],
    [{ least: 2, whole: true }, 'whole, at least 2'],
    [{}, 'any number'],
  ])('a range in words: %o', (bounds, words) => {
    const field = fieldAt(root, ['generations'], study);
    if (field?.kind !== 'number') throw new Error('not a number');
    const open = { ...field, whole: false, least: null, most: null, aboveLeast: false, belowMost: false };
    expect(rangeWords({ ...open, ...bounds })).toBe(words);
  });
});
