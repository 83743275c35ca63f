import { describe, expect, test } from 'vitest';
import { draftOf, faultsOf, faultsWithin, pathAt, spotOf } from '../../../viewer/sheet/draft.js';
import { SAMPLE } from './sample.js';

describe('a draft', () => {
  test('of a right study has no fault and a study', () => {
    const draft = draftOf(SAMPLE);
    expect(draft.faults).toEqual([]);
    expect(draft.study?.population.households).toBe(300);
  });

  test.each([
    ['curvature: 0.6 ', 'curvature: -1 ', ['preferences', 'curvature'], '-1'],
    ['curvature: 0.6 ', 'curvatur: 0.6 ', ['preferences', 'curvatur'], 'curvatur'],
    ['mean: 100', 'mean: lots', ['population', 'wealth', 'mean'], 'lots'],
    ['generations: 6\n', '', ['generations'], null],
    ['    mean: 100\n', '', ['population', 'wealth', 'mean'], null],
    ['share: 0.65', 'share: 0.75', ['population', 'groups'], null],
    ['kind: blocks', 'kind: block', ['arms', 0, 'network', 'kind'], 'block'],
    ['from: segregated', 'from: segregatd', ['arms', 1, 'network', 'from'], 'segregatd'],
    ['statistic: upward_mean', 'statistic: upward', ['reference', 'milestones', 0, 'mix', 1, 'statistic'], 'upward'],
  ])('finds the setting of a fault: %s as %s', (was, is, path, marked) => {
    const text = SAMPLE.replace(was, is);
    const [fault, ...more] = draftOf(text).faults;
    expect(more).toEqual([]);
    expect(fault!.path).toEqual(path);
    if (marked !== null) expect(text.slice(fault!.from, fault!.to)).toBe(marked);
  });

  test('keeps the last values while the text is not YAML', () => {
    const draft = draftOf(`${SAMPLE}keep: [`, draftOf(SAMPLE));
    expect(draft.readable).toBe(false);
    expect(draft.raw).toMatchObject({ generations: 6 });
    expect(draft.faults[0]).toMatchObject({ code: 'bad-yaml' });
  });

  test('of an empty text is a fault of the whole study', () => {
    expect(draftOf('').faults).toMatchObject([{ code: 'empty-study', path: [] }]);
  });

  test('says what stands at a place, and where a setting stands', () => {
    const draft = draftOf(SAMPLE);
    const at = SAMPLE.indexOf('0.42');
    expect(pathAt(draft, at)).toEqual(['population', 'wealth', 'gini']);
    expect(pathAt(draft, SAMPLE.indexOf('# σ'))).toEqual(['preferences', 'curvature']);
    expect(pathAt(draft, SAMPLE.indexOf('# the end') + 3)).toBeNull();
    const spot = spotOf(draft, ['population', 'wealth', 'gini'])!;
    expect(SAMPLE.slice(spot.from, spot.to)).toBe('gini: 0.42');
    // a setting that is not written is looked for at the part around it
    expect(spotOf(draft, ['shock', 'risk'])!.path).toEqual(['shock']);
    expect(spotOf(draft, ['keep'])).toBeNull();
  });

  test('places faults of a later step, and those of other files', () => {
    const draft = draftOf(SAMPLE);
    const line = SAMPLE.slice(0, SAMPLE.indexOf('mixing')).split('\n').length;
    const column =
      SAMPLE.slice(0, SAMPLE.indexOf('mixing')).length - SAMPLE.lastIndexOf('\n', SAMPLE.indexOf('mixing'));
    const faults = faultsOf(draft, [
      { code: 'out-of-reach', place: `study:${line}:${column}`, problem: 'p', remedy: 'r' },
      { code: 'bad-wealth', place: 'people.csv row 3 column wealth', problem: 'p', remedy: 'r' },
    ]);
    expect(faults[0]!.path).toEqual(['arms', 1, 'network', 'mixing']);
    expect(faults[1]).toMatchObject({ elsewhere: 'people.csv row 3 column wealth', path: [] });
    expect(faultsWithin(faults, ['arms'])).toHaveLength(1);
  });
});
