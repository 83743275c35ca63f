/**
 * The tables at the end of the report: indicators by arm and generation, contrasts with intervals, frustration by part of
 * society.
 */
import { contrastRow } from '../contrasts.js';
import type { Evidence } from './evidence.js';
import { fixed, NONE, num, p, pct, table } from './words.js';

/** Rows of the table of indicators: names in plain words, and how their values are written. */
const LISTED: readonly (readonly [string, string, (x: number) => string])[] = [
  ['mean_wealth', 'mean wealth', num],
  ['median_wealth', 'median wealth', num],
  ['share_frustrated', 'share frustrated', (x) => pct(x, 1)],
  ['mean_aspiration_gap', 'mean aspiration gap', (x) => fixed(x, 2)],
  ['gini', 'Gini', (x) => fixed(x, 3)],
  ['theil_t', 'Theil T', (x) => fixed(x, 3)],
  ['theil_t_between_places', 'of it between places', (x) => fixed(x, 3)],
  ['theil_t_between_groups', 'of it between groups', (x) => fixed(x, 3)],
  ['share_bottom_40', 'share of wealth of the poorest 40 %', (x) => pct(x, 1)],
  ['share_top_10', 'share of wealth of the richest 10 %', (x) => pct(x, 1)],
  ['p90_p10', 'P90/P10', (x) => fixed(x, 2)],
  ['wolfson', 'Wolfson polarisation', (x) => fixed(x, 3)],
  ['der_half', 'Duclos–Esteban–Ray polarisation', (x) => fixed(x, 3)],
  ['modes', 'modes of log wealth', (x) => fixed(x, 1)],
  ['elasticity', 'intergenerational elasticity', (x) => fixed(x, 2)],
  ['rank_rank_slope', 'rank–rank slope', (x) => fixed(x, 2)],
  ['upward_mobility', 'children richer than parents', (x) => pct(x, 1)],
  ['join_count_z', 'clustering of frustration (z)', (x) => fixed(x, 1)],
  ['moran', 'Moran’s I of log wealth', (x) => fixed(x, 3)],
  ['economic_connectedness', 'economic connectedness', (x) => fixed(x, 2)],
  ['pockets', 'pockets', (x) => fixed(x, 1)],
  ['pocket_share', 'households in pockets', (x) => pct(x, 1)],
  ['sheltered_share', 'sheltered', (x) => pct(x, 1)],
  ['complacent_share', 'complacent', (x) => pct(x, 1)],
];

/** Arms that fit side by side on A4. */
const SIDE_BY_SIDE = 2;

/** The section, without its heading. */
export function tablesSection(e: Evidence): string {
  return [indicators(e), contrasts(e), byPart(e)].filter((html) => html !== '').join('\n');
}

function known(e: Evidence): typeof LISTED {
  return LISTED.filter(
    ([name]) =>
      e.cube.has(name) && columns(e).some((t) => e.cube.arms.some((_, a) => !Number.isNaN(e.cube.mean(name, a, t)))),
  );
}

/** The moments of the report, and the final children. */
function columns(e: Evidence): number[] {
  return [...new Set([...e.moments, e.cube.generations - 1])];
}

function indicators(e: Evidence): string {
  const moments = columns(e);
  const { arms } = e.cube;
  const out: string[] = [];
  for (let from = 0; from < arms.length; from += SIDE_BY_SIDE) {
    const some = arms.slice(from, from + SIDE_BY_SIDE);
    out.push(
      table(
        `Indicators by generation, means over ${e.cube.replicates === 1 ? 'one replicate' : `${e.cube.replicates} replicates`}`,
        ['generation', ...some.flatMap(() => moments.map(String))],
        known(e).map(([name, label, form]) => [
          label,
          ...some.flatMap((_, k) =>
            moments.map((t) => {
              const value = e.cube.mean(name, from + k, t);
              return Number.isNaN(value) ? NONE : form(value);
            }),
          ),
        ]),
        { over: some.map((text) => ({ text, columns: moments.length })) },
      ),
    );
  }
  return (
    out.join('\n') +
    p(
      `Generation ${e.cube.generations - 1} holds the children of the last decision. All measures, in every generation and replicate: indicators.csv; what each means and how it is computed: codebook.md.`,
      'note',
    )
  );
}

function contrasts(e: Evidence): string {
  if (e.cube.arms.length < 2 || e.cube.replicates < 2) return '';
  const moments = columns(e).filter((t) => t > 0);
  const cell = (arm: number, name: string, form: (x: number) => string, t: number): string => {
    const row = contrastRow(e.cube, arm, 0, name, t);
    if (row === null) return NONE;
    const bare = (x: number): string => form(x).replace(' %', '');
    const clear = row.ci_low > 0 || row.ci_high < 0;
    return `${bare(row.difference)}${clear ? '*' : ''} (${bare(row.ci_low)} to ${bare(row.ci_high)})`;
  };
  return (
    e.cube.arms
      .slice(1)
      .map((arm, k) =>
        table(
          `‘${arm}’ minus ‘${e.cube.arms[0]}’ by generation: difference and 95 % interval`,
          ['generation', ...moments.map(String)],
          known(e).map(([name, label, form]) => [
            form(0.5).endsWith('%') ? `${label}, points` : label,
            ...moments.map((t) => cell(k + 1, name, form, t)),
          ]),
        ),
      )
      .join('\n') +
    p(
      `Paired over ${e.cube.replicates} replicates with the same households and luck. * The interval leaves zero out. Many are tested: one in twenty would by chance. All differences: contrasts.csv.`,
      'note',
    )
  );
}

const PARTS: Readonly<Record<string, string>> = {
  group: 'group',
  place_quintile: 'fifth of places',
  wealth_quintile: 'fifth of wealth',
};

function levelWords(by: string, level: string): string {
  if (by === 'group') return level;
  return level === '1' ? '1, poorest' : level === '5' ? '5, richest' : level;
}

function byPart(e: Evidence): string {
  const { frustration: f } = e;
  if (f.count === 0) return '';
  // share by part, arm and moment, summed over replicates
  const sums = new Map<string, { sum: number; n: number }>();
  const parts: { by: string; level: string }[] = [];
  const seen = new Set<string>();
  for (let k = 0; k < f.count; k++) {
    const t = f.number('generation', k);
    if (!e.moments.includes(t)) continue;
    const by = f.text('by', k);
    const level = f.text('level', k);
    const share = f.number('share_frustrated', k);
    if (Number.isNaN(share)) continue;
    if (!seen.has(`${by}\n${level}`)) {
      seen.add(`${by}\n${level}`);
      parts.push({ by, level });
    }
    const key = `${by}\n${level}\n${f.text('arm', k)}\n${t}`;
    const at = sums.get(key) ?? { sum: 0, n: 0 };
    sums.set(key, { sum: at.sum + share, n: at.n + 1 });
  }
  const groups = parts.filter((part) => part.by === 'group').length;
  const listed = parts.filter((part) => part.by !== 'group' || groups > 1);
  const { arms } = e.cube;
  const out: string[] = [];
  for (let from = 0; from < arms.length; from += SIDE_BY_SIDE + 1) {
    const some = arms.slice(from, from + SIDE_BY_SIDE + 1);
    out.push(
      table(
        'Share frustrated by part of society, means over replicates',
        ['generation', ...some.flatMap(() => e.moments.map(String))],
        listed.map(({ by, level }) => [
          `${PARTS[by] ?? by}: ${levelWords(by, level)}`,
          ...some.flatMap((arm) =>
            e.moments.map((t) => {
              const at = sums.get(`${by}\n${level}\n${arm}\n${t}`);
              return at === undefined ? NONE : pct(at.sum / at.n);
            }),
          ),
        ]),
        { over: some.map((text) => ({ text, columns: e.moments.length })) },
      ),
    );
  }
  return out.join('\n');
}
