import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { Lexer, parse } from 'yaml';
import {
  difference,
  insertItem,
  type Path,
  removeValue,
  setValue,
  UnreadableYaml,
  type Value,
  valueAt,
} from '../../../viewer/sheet/edit.js';
import { SAMPLE } from './sample.js';

function comments(text: string): string[] {
  return [...new Lexer().lex(text)].filter((token) => token.startsWith('#')).map((token) => token.trim());
}

/** Lines of `after` that `before` does not have, and the other way round. */
function changed(before: string, after: string): [removed: string[], added: string[]] {
  const a = before.split('\n');
  const b = after.split('\n');
  return [a.filter((line) => !b.includes(line)), b.filter((line) => !a.includes(line))];
}

describe('setting a value', () => {
  test('replaces a number and leaves its comment where it stands', () => {
    expect(changed(SAMPLE, setValue(SAMPLE, ['preferences', 'curvature'], 0.75))).toEqual([
      ['  curvature: 0.6                  # σ'],
      ['  curvature: 0.75                  # σ'],
    ]);
  });

  test('keeps quotes that were there and adds them only where needed', () => {
    expect(setValue(SAMPLE, ['arms', 1, 'name'], 'half')).toContain('- name: "half"                 # the other arm');
    expect(setValue(SAMPLE, ['study'], 'Hill: and plain')).toContain('study: "Hill: and plain"                # title');
    expect(setValue(SAMPLE, ['study'], 'no')).toContain('study: "no" ');
    expect(setValue(SAMPLE, ['seed'], '12')).toContain('seed: "12" ');
  });

  test('adds a key of a block where the order puts it', () => {
    const order = (path: Path): readonly string[] =>
      path.length === 0 ? ['study', 'seed', 'replicates', 'generations', 'currency', 'population'] : [];
    expect(setValue(SAMPLE, ['currency'], 'pesos', order)).toContain('generations: 6\ncurrency: pesos\n\npopulation:');
  });

  test('adds a key inside brackets', () => {
    expect(setValue(SAMPLE, ['shock', 'shared_by_place'], 0.3)).toContain(
      'shock: {sd_log: 0.2, shared_by_place: 0.3}\n',
    );
  });

  test('adds a section that was not there, on one line when it is small', () => {
    const order = (): readonly string[] => ['arms', 'pockets', 'keep'];
    expect(setValue(SAMPLE, ['keep', 'panel'], 'none', order)).toMatch(
      /mixing: \{share: 0.5\}\nkeep: \{panel: none\}\n# the end\n$/,
    );
  });

  test('turns a number into a map and back', () => {
    const spread = setValue(SAMPLE, ['population', 'places'], { count: 10, size_cv: 0.4 });
    expect(spread).toContain('  places: {count: 10, size_cv: 0.4}                      # villages');
    expect(setValue(spread, ['population', 'places'], 10)).toBe(SAMPLE);
  });

  test('fills an empty value', () => {
    expect(setValue('study: a\nseed:\nreplicates: 2\n', ['seed'], 'x')).toBe('study: a\nseed: x\nreplicates: 2\n');
    expect(parse(setValue('arms:\nstudy: a\n', ['arms', 0, 'name'], 'x'))).toEqual({
      arms: [{ name: 'x' }],
      study: 'a',
    });
  });

  test('starts a study from nothing', () => {
    expect(setValue('', ['study'], 'New')).toBe('study: New\n');
  });

  test('refuses text that is not YAML', () => {
    expect(() => setValue('a: [1', ['a'], 2)).toThrow(UnreadableYaml);
  });

  test('refuses what would change a second place through an alias, and edits beside it', () => {
    const text = 'base: &b {x: 1}\nother: *b\nlast: 3\n';
    expect(() => setValue(text, ['base', 'x'], 2)).toThrow(UnreadableYaml);
    expect(setValue(text, ['last'], 4)).toBe('base: &b {x: 1}\nother: *b\nlast: 4\n');
  });
});

describe('removing a value', () => {
  test('takes the line and keeps its comment', () => {
    const text = removeValue(SAMPLE, ['population', 'wealth', 'gini']);
    expect(text).toContain('    mean: 100\n    # or sd_log\n    between_places: 0.4\n');
    expect(comments(text)).toEqual(comments(SAMPLE));
  });

  test('takes a key out of brackets, first, middle and last', () => {
    const network = (key: string): string => removeValue(SAMPLE, ['arms', 0, 'network', key]);
    expect(network('kind')).toContain('network: {mean_degree: 10, within_place: 0.9, within_group: 0.8}\n');
    expect(network('within_place')).toContain('network: {kind: blocks, mean_degree: 10, within_group: 0.8}\n');
    expect(network('within_group')).toContain('network: {kind: blocks, mean_degree: 10, within_place: 0.9}\n');
  });

  test('takes an emptied map with it', () => {
    expect(removeValue(SAMPLE, ['shock', 'sd_log'])).not.toContain('shock');
    expect(removeValue(SAMPLE, ['population', 'groups', 1, 'preferences', 'child_weight'])).toContain(
      '{name: upland, share: 0.35, relative_wealth: 0.5}   # poorer\n',
    );
  });

  test('takes the first key beside a dash', () => {
    expect(removeValue(SAMPLE, ['arms', 1, 'name'])).toContain(
      '  - # the other arm\n    network:\n      from: segregated',
    );
  });

  test('takes an entry of a list, with its lines only', () => {
    expect(changed(SAMPLE, removeValue(SAMPLE, ['reference', 'milestones', 0, 'mix', 1]))).toEqual([
      ['        - {from: neighbours, statistic: upward_mean, weight: 0.7}'],
      [],
    ]);
    expect(removeValue(SAMPLE, ['arms', 1])).toMatch(/within_group: 0.8\}\n# the end\n$/);
  });

  test('leaves the text alone when there is nothing to remove', () => {
    expect(removeValue(SAMPLE, ['pockets'])).toBe(SAMPLE);
  });
});

describe('inserting into a list', () => {
  test('writes an entry the way its neighbour is written', () => {
    expect(insertItem(SAMPLE, ['population', 'groups'], 2, { name: 'coast', share: 0.1 })).toContain(
      '# poorer\n    - {name: coast, share: 0.1}\n  wealth:',
    );
    expect(insertItem(SAMPLE, ['arms'], 2, { name: 'ring', network: { kind: 'ring', degree: 8 } })).toMatch(
      /share: 0.5\}\n {2}- name: ring\n {4}network: \{kind: ring, degree: 8\}\n# the end\n$/,
    );
  });

  test('inserts before the first', () => {
    expect(insertItem(SAMPLE, ['reference', 'milestones', 0, 'mix'], 0, { from: 'group', weight: 0 })).toContain(
      '      mix:\n        - {from: group, weight: 0}\n        - {from: self, weight: 0.1}\n',
    );
  });

  test('makes the list', () => {
    const text = removeValue(SAMPLE, ['population', 'groups']);
    expect(parse(insertItem(text, ['population', 'groups'], 0, { name: 'all', share: 1 })).population.groups).toEqual([
      { name: 'all', share: 1 },
    ]);
  });
});

describe('any edit', () => {
  // paths of the sample's scalars, and keys that may be added
  const paths: Path[] = [];
  const walk = (value: unknown, path: Path): void => {
    if (value !== null && typeof value === 'object') {
      for (const [key, inner] of Object.entries(value))
        walk(inner, [...path, Array.isArray(value) ? Number(key) : key]);
    } else paths.push(path);
  };
  walk(parse(SAMPLE), []);
  const holders = [...new Set(paths.map((path) => JSON.stringify(path.slice(0, -1))))].map(
    (path) => JSON.parse(path) as Path,
  );
  const anyPath = fc.oneof(
    fc.constantFrom(...paths),
    fc
      .constantFrom(...holders.filter((path) => !Array.isArray(valueAt(parse(SAMPLE), path))))
      .map((path): Path => [...path, 'added']),
  );
  const anyScalar: fc.Arbitrary<Value> = fc.oneof(
    fc.string({ maxLength: 12 }),
    fc.double({ noNaN: true, noDefaultInfinity: true }).map((x) => (Object.is(x, -0) ? 0 : x)),
    fc.boolean(),
    fc.constantFrom('true', '1e3', 'a: b', '- x', 'x # y', "it's", 'a, b', '[x', 'é–ü', '0x1F', '12', '', ' '),
  );

  test('says what was asked, keeps every comment and touches one line', () => {
    fc.assert(
      fc.property(anyPath, anyScalar, (path, value) => {
        const text = setValue(SAMPLE, path, value);
        expect(valueAt(parse(text), path)).toEqual(value);
        expect(comments(text)).toEqual(expect.arrayContaining(comments(SAMPLE)));
        const [removed, added] = changed(SAMPLE, text);
        expect(removed.length).toBeLessThanOrEqual(1);
        expect(added.length).toBeLessThanOrEqual(1);
      }),
      { numRuns: 400 },
    );
  });

  test('removal says nothing else than before and keeps every comment', () => {
    for (const path of paths) {
      const text = removeValue(SAMPLE, path);
      expect(valueAt(parse(text), path)).toBeUndefined();
      expect(comments(text)).toEqual(comments(SAMPLE));
      const kept = paths.filter((other) => JSON.stringify(other) !== JSON.stringify(path));
      // list positions behind a removed entry do not move: only keys are removed here
      const before = parse(SAMPLE);
      const after = parse(text);
      expect(kept.filter((other) => valueAt(after, other) !== valueAt(before, other))).toEqual([]);
    }
  });

  test('removing an added key gives the text back', () => {
    for (const holder of holders) {
      if (Array.isArray(valueAt(parse(SAMPLE), holder))) continue;
      const path = [...holder, 'added'];
      expect(removeValue(setValue(SAMPLE, path, 3), path)).toBe(SAMPLE);
    }
  });

  test('the difference of two texts turns one into the other', () => {
    fc.assert(
      fc.property(fc.string(), fc.string(), (before, after) => {
        const change = difference(before, after);
        const made = change === null ? before : before.slice(0, change.from) + change.insert + before.slice(change.to);
        expect(made).toBe(after);
      }),
    );
  });
});
