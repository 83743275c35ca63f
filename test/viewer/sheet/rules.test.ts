import { describe, expect, test } from 'vitest';
import { parse } from 'yaml';
import { StudyFile } from '../../../sim/study/schema.js';
import { draftOf } from '../../../viewer/sheet/draft.js';
import { type Path, setValue, valueAt } from '../../../viewer/sheet/edit.js';
import { type Field, fieldAt, fieldOf, type GroupField } from '../../../viewer/sheet/fields.js';
import { otherSpread, turnOrigin } from '../../../viewer/sheet/population.js';
import { begunVariant, belongs, follow, turn } from '../../../viewer/sheet/rules.js';
import { starter } from '../../../viewer/sheet/words.js';
import { SAMPLE } from './sample.js';

const root = fieldOf(StudyFile) as GroupField;
const order = (): readonly string[] => [];

function choose(text: string, path: Path, chosen: string): string {
  const group = path.slice(0, -1);
  const out = setValue(text, path, chosen);
  const raw = parse(out) as unknown;
  const field = fieldAt(root, group, raw) as GroupField;
  return follow(out, group, field, String(path.at(-1)), valueAt(raw, group) as Record<string, unknown>, order);
}

describe('a choice keeps the study whole', () => {
  test.each([
    ['population.wealth.shape', ['lognormal', 'pareto_tail', 'quantile_shares']],
    ['preferences.milestone_shape', ['threshold', 'gain-loss']],
    ['reference.milestones.0.mix.1.statistic', ['mean', 'median', 'quantile', 'upward_mean', 'similarity_mean', 'max']],
  ])('%s, every value after every other', (at, values) => {
    const path = at.split('.').map((step) => (/^\d+$/.test(step) ? Number(step) : step));
    for (const first of values) {
      for (const second of values) {
        const text = choose(choose(SAMPLE, path, first), path, second);
        expect(
          `${first} → ${second}: ${draftOf(text)
            .faults.map((fault) => fault.problem)
            .join()}`,
        ).toBe(`${first} → ${second}: `);
      }
    }
  });

  test('curvature of 1 and more asks for a milestone curvature when thresholds come back', () => {
    const loss = choose(
      SAMPLE.replace('curvature: 0.6 ', 'curvature: 1.5 '),
      ['preferences', 'milestone_shape'],
      'gain-loss',
    );
    expect(draftOf(loss).faults).toEqual([]);
    const back = choose(loss, ['preferences', 'milestone_shape'], 'threshold');
    expect(draftOf(back).faults).toEqual([]);
    expect(parse(back).preferences).toMatchObject({ milestone_curvature: 0.6 });
  });
});

describe('what belongs', () => {
  test('a written setting always shows, a ruled-out one does not', () => {
    expect(belongs('q', { statistic: 'mean' })).toBe(false);
    expect(belongs('q', { statistic: 'mean', q: 0.5 })).toBe(true);
    expect(belongs('sd_log', { shape: 'lognormal' })).toBe(false);
    expect(belongs('gini', { shape: 'lognormal', sd_log: 0.5 })).toBe(false);
    expect(belongs('scale', {}, { kind: 'linear' })).toBe(false);
    expect(belongs('scale', { kind: 'concave' }, { kind: 'linear' })).toBe(true);
  });
});

describe('alternatives', () => {
  const unions: [Path, Field][] = [
    [['technology'], fieldAt(root, ['technology'], {})!],
    [['population', 'places'], fieldAt(root, ['population', 'places'], {})!],
    [['arms', 1, 'network', 'mixing'], fieldAt(root, ['arms', 1, 'network', 'mixing'], parse(SAMPLE))!],
    [['arms', 0, 'network'], fieldAt(root, ['arms', 0, 'network'], {})!],
    [['keep', 'panel'], fieldAt(root, ['keep', 'panel'], {})!],
  ];

  test.each(unions)('%j: turned into each, and from each into each other, is a study', (path, union) => {
    if (union.kind !== 'union') throw new Error('not a union');
    for (const first of union.variants) {
      for (const second of union.variants) {
        let text = SAMPLE;
        for (const to of [first, second]) text = turn(text, path, union, to, parse(text), order);
        if (second.name === 'from')
          text = setValue(text, [...path, 'from'], 'mixed').replace('from: segregated', 'kind: random, mean_degree: 3');
        const faults = draftOf(text).faults.filter(
          (fault) => second.name !== 'from' || !fault.problem.includes('circle'),
        );
        // 'from' makes this arm of the other, which the sample makes of this one
        if (second.name === 'from') continue;
        expect(`${first.name} → ${second.name}: ${faults.map((fault) => fault.problem).join()}`).toBe(
          `${first.name} → ${second.name}: `,
        );
      }
    }
  });

  test('every required setting of every alternative has something to start from', () => {
    const missing: string[] = [];
    const look = (field: Field): void => {
      if (field.kind === 'union') {
        for (const variant of field.variants) {
          begunVariant(field, variant);
          look(variant.field);
        }
      } else if (field.kind === 'group') field.fields.forEach(look);
      else if (field.kind === 'list') look(field.item);
      else if (!field.optional && field.key !== '' && field.kind !== 'choice' && starter(field.key) === undefined) {
        missing.push(field.key);
      }
    };
    for (const field of root.fields)
      if (['population', 'technology', 'preferences', 'reference', 'arms'].includes(field.key)) look(field);
    expect(missing).toEqual([]);
  });
});

describe('households drawn or from a file', () => {
  test('there and back is a study each time, preferences of groups kept', () => {
    const file = turnOrigin(SAMPLE, parse(SAMPLE), 'file', 'people.csv', order);
    expect(draftOf(file).faults).toEqual([]);
    expect(parse(file).population).toEqual({
      households_file: 'people.csv',
      groups: [{ name: 'upland', preferences: { child_weight: 0.33 } }],
    });
    const drawn = turnOrigin(file, parse(file), 'drawn', '', order);
    expect(parse(drawn).population).toMatchObject({ households: 1000, wealth: { shape: 'lognormal' } });
  });

  test('groups without preferences of their own go altogether', () => {
    const plain = SAMPLE.replace(', preferences: {child_weight: 0.33}', '');
    const file = turnOrigin(plain, parse(plain), 'file', 'people.csv', order);
    expect(draftOf(file).faults).toEqual([]);
    expect(parse(file).population).toEqual({ households_file: 'people.csv' });
  });
});

describe('spread of wealth', () => {
  test('Gini 0.42 and standard deviation of log 0.783 are the same lognormal (Aitchison and Brown 1957)', () => {
    const gini: Path = ['population', 'wealth', 'gini'];
    const sd: Path = ['population', 'wealth', 'sd_log'];
    const text = otherSpread(gini, parse(SAMPLE), order)!.edit(SAMPLE);
    // s = √2·Φ⁻¹((1 + 0.42)/2) = 1.41421 × 0.55338, three figures
    expect(parse(text).population.wealth).toEqual({
      shape: 'lognormal',
      mean: 100,
      sd_log: 0.783,
      between_places: 0.4,
    });
    expect(parse(otherSpread(sd, parse(text), order)!.edit(text)).population.wealth.gini).toBe(0.42);
    expect(otherSpread(['shock', 'sd_log'], parse(SAMPLE), order)).toBeNull();
  });
});
