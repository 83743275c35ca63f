/**
 * Moran's I, local Moran and join counts on 49 Columbus neighbourhoods (Anselin 1988) and 42 African countries (Anselin
 * 1995): values by R spdep 1.2.7 and numpy, two routes; see SOURCES.md.
 */
import { expect, test } from 'vitest';
import { joinCounts } from '../../network/measure/join-counts.js';
import { localMoran } from '../../network/measure/local-moran.js';
import { moran } from '../../network/measure/moran.js';
import { checksOf } from './expected.js';
import { codes, expectDefined, netOf } from './net.js';

const STYLES = [
  ['B', 'binary'],
  ['W', 'row'],
] as const;

const SETS = [
  { set: 'spatial-columbus', values: ['CRIME', 'INC', 'HOVAL'], local: 'CRIME', splits: ['hicrime', 'cp'] },
  { set: 'spatial-afcon', values: ['totcon'], local: 'totcon', splits: ['above'] },
];

test.each(SETS)('$set: Moran’s I', ({ set, values }) => {
  const checks = checksOf(set);
  const { ties, columns } = netOf(set, 'data.csv');
  for (const name of values) {
    for (const [letter, style] of STYLES) {
      const m = moran(ties, Float64Array.from(columns[name], Number), style);
      expectDefined(
        {
          I: m.i,
          E: m.expected,
          var_rand: m.varianceRandom,
          z_rand: m.zRandom,
          p_rand_two: m.pRandom,
          var_norm: m.varianceNormal,
          z_norm: m.zNormal,
          p_norm_two: m.pNormal,
        },
        checks[`moran.${letter}.${name}`],
        `moran.${letter}.${name}`,
      );
    }
  }
});

test.each(SETS)('$set: local Moran', ({ set, local }) => {
  const checks = checksOf(set);
  const { ties, columns } = netOf(set, 'data.csv');
  const value = Float64Array.from(columns[local], Number);
  for (const [letter, style] of STYLES) {
    for (const moments of ['conditional', 'total'] as const) {
      const l = localMoran(ties, value, style, moments);
      const id = `localmoran.${letter}.${local}.${moments}`;
      expectDefined({ Ii: l.i, E: l.expected, var: l.variance, z: l.z, p_two: l.p }, checks[id], id);
    }
  }
});

test.each(SETS)('$set: join counts', ({ set, splits }) => {
  const checks = checksOf(set);
  const { ties, columns } = netOf(set, 'data.csv');
  for (const name of splits) {
    for (const [letter, style] of STYLES) {
      const id = `joincount.${letter}.${name}`;
      const { group, levels } = codes(columns[name]);
      expect(levels).toEqual(checks[id]['levels']);
      const { marked, unmarked, unlike } = joinCounts(ties, group, style);
      expectDefined(
        {
          same1: unmarked.count,
          E1: unmarked.expected,
          V1: unmarked.variance,
          same2: marked.count,
          E2: marked.expected,
          V2: marked.variance,
          diff: unlike.count,
          Ed: unlike.expected,
          Vd: unlike.variance,
        },
        checks[id],
        id,
      );
    }
  }
});

