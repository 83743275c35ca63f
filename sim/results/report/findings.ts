/**
 * What was found, section by section: a sentence in plain words, then the figure it comes from.
 *
 * A section is null when the study has nothing for it. Figures are at most 440 units wide, so that their text can be read
 * on a telephone; wide pages set two or three side by side.
 */
import { drawnSameGroupShare, tiedSameGroupShare } from '../../../network/arrange/drawn-share.js';
import { toPairs } from '../../../network/graph.js';
import { quantileOfSorted } from '../../measure/quantile.js';
import { type ContrastRow, contrastRow } from '../contrasts.js';
import { densitiesFigure } from '../figures/densities.js';
import { fieldFigure } from '../figures/field.js';
import { safe } from '../figures/figure.js';
import { type Interval, intervalsFigure, intervalsHeight } from '../figures/intervals.js';
import { lifelinesFigure, type PocketMoment } from '../figures/lifelines.js';
import { linesFigure, type Series } from '../figures/lines.js';
import { networkFigure, tiesDefinition } from '../figures/network.js';
import { type Transition, transitionsFigure } from '../figures/transitions.js';
import type { ArmShown, Evidence, Moment } from './evidence.js';
import { MAP_LIMIT } from './evidence.js';
import { count, fixed, grouped, list, num, p, pct, plate, pValue, sentence, table } from './words.js';

/** A section of the report. */
export interface Section {
  readonly id: string;
  readonly title: string;
  readonly html: string;
}

const WIDE = 420;
/** Most ties and marks drawn over all networks together: keeps the page within what can be sent by mail. */
const TIES_DRAWN = 24_000;
const MARKS_DRAWN = 36_000;
/** Households marked on a ladder: more would cover each other. */
const LADDER_MARKS = 900;

/** Sections with figures, in order. */
export function findings(e: Evidence): Section[] {
  return [frustration(e), wealth(e), growth(e), mobility(e), networks(e), pockets(e), regimes(e)].filter(
    (section) => section !== null,
  );
}

function quoted(name: string): string {
  return `‘${name}’`;
}

/** Mean of an indicator by generation with the middle 80 % of replicates. */
function seriesOf(e: Evidence, indicator: string, from: number, to: number): Series[] {
  const { cube } = e;
  return cube.arms.map((name, a) => {
    const x = Array.from({ length: to - from + 1 }, (_, k) => from + k);
    const at = (t: number, q: number): number => {
      const values = cube
        .over(indicator, a, t)
        .filter((v) => !Number.isNaN(v))
        .sort();
      return values.length < 2 ? NaN : quantileOfSorted(values, q);
    };
    return {
      name,
      x,
      y: x.map((t) => cube.mean(indicator, a, t)),
      low: x.map((t) => at(t, 0.1)),
      high: x.map((t) => at(t, 0.9)),
    };
  });
}

function has(e: Evidence, indicator: string): boolean {
  const { cube } = e;
  if (!cube.has(indicator)) return false;
  return cube.arms.some((_, a) =>
    Array.from({ length: cube.generations }, (_g, t) => cube.mean(indicator, a, t)).some((v) => !Number.isNaN(v)),
  );
}

function bandWords(e: Evidence): string {
  return e.cube.replicates > 1
    ? ` Line: mean over ${count(e.cube.replicates, 'replicate')}; band: the middle 80 % of them.`
    : ' One replicate.';
}

function ticks(last: number): number[] {
  const step = Math.max(1, Math.ceil((last + 1) / 11));
  return Array.from({ length: Math.floor(last / step) + 1 }, (_, k) => k * step);
}

/** The least round number of tenths at or above a share. */
function roof(series: readonly Series[]): number {
  const top = Math.max(
    0.1,
    ...series.flatMap((s) => [...Array.from(s.y), ...Array.from(s.high ?? [])]).filter(Number.isFinite),
  );
  return Math.min(1, Math.ceil(top * 10) / 10);
}

/** Contrasts of the other arms with the first, a row a generation. */
function contrastsOf(e: Evidence, a: number, indicator: string, last: number): ContrastRow[] {
  return Array.from({ length: last + 1 }, (_, t) => contrastRow(e.cube, a, 0, indicator, t)).filter(
    (row) => row !== null,
  );
}

function contrastPlates(
  e: Evidence,
  indicator: string,
  last: number,
  o: { readonly what: string; readonly says: string; readonly names: (v: number) => string },
): string {
  if (e.cube.replicates < 2) return '';
  return e.cube.arms
    .slice(1)
    .map((arm, k) => {
      const rows = contrastsOf(e, k + 1, indicator, last);
      if (rows.length === 0) return '';
      const intervals = rows.map(
        (row): Interval => ({
          name: `generation ${row.generation}`,
          estimate: row.difference,
          low: row.ci_low,
          high: row.ci_high,
          series: k + 1,
        }),
      );
      const clear = rows.filter((row) => row.ci_low > 0 || row.ci_high < 0).length;
      return plate(
        intervalsFigure({ width: WIDE, height: intervalsHeight(rows.length) }, intervals, {
          title: `${sentence(o.what)}: ${arm} minus ${e.cube.arms[0]}`,
          described: rows.map((row) => `generation ${row.generation}: ${o.names(row.difference)}`).join('; '),
          xSays: `${o.says}, 95 % interval`,
          names: o.names,
        }),
        `${sentence(o.what)} in ${quoted(arm)} minus ${quoted(e.cube.arms[0])}, paired over replicates. Filled where the ` +
          `interval leaves zero out: ${clear} of ${rows.length} generations.`,
      );
    })
    .join('');
}

function frustration(e: Evidence): Section {
  const last = e.study.generations - 1;
  const series = seriesOf(e, 'share_frustrated', 0, last);
  const words = series.map((s) => {
    let top = 0;
    for (let t = 1; t <= last; t++) if (s.y[t] > s.y[top]) top = t;
    const start = `in ${quoted(s.name)} ${pct(s.y[0])} of households are frustrated at the start`;
    const end = `${pct(s.y[last])} in generation ${last}`;
    return top === 0 || top === last
      ? `${start}${top === 0 ? ', the most,' : ''} and ${end}${top === 0 ? '' : ', the most'}`
      : `${start}, ${pct(s.y[top])} at the peak in generation ${top} and ${end}`;
  });
  const clustered = has(e, 'join_count_z') ? seriesOf(e, 'join_count_z', 0, last) : null;
  const t = e.telling;
  const clusterWords =
    clustered === null
      ? ''
      : p(
          `Do the frustrated sit together? Ties between two frustrated households are counted against what chance would give ` +
            `(join counts, Cliff and Ord 1981). In generation ${t} the count lies ${list(
              clustered.map((s) => `${fixed(s.y[t], 1)} standard deviations from chance in ${quoted(s.name)}`),
            )}; beyond 2 is more than chance explains.`,
        );
  return {
    id: 'frustration',
    title: 'Frustration, generation by generation',
    html:
      p(`${sentence(words.join('; '))}.`) +
      clusterWords +
      `<div class="plates">${plate(
        linesFigure({ width: WIDE, height: 270 }, series, {
          title: 'Share of households frustrated, by generation',
          described: series.map((s) => `${s.name}: ${Array.from(s.y, (v) => pct(v)).join(', ')}`).join('. '),
          xSays: 'generation',
          ySays: 'share frustrated',
          xNames: String,
          yNames: (v) => pct(v, 0),
          yRange: [0, roof(series)],
          xTicks: ticks(last),
        }),
        `Share of households that meet no milestone.${bandWords(e)}`,
      )}${contrastPlates(e, 'share_frustrated', last, {
        what: 'share frustrated',
        says: 'percentage points',
        names: (v) => fixed(100 * v, Math.abs(v) < 0.1 && v !== 0 ? 1 : 0),
      })}${
        clustered === null
          ? ''
          : plate(
              linesFigure({ width: WIDE, height: 250 }, clustered, {
                title: 'Clustering of frustration, by generation',
                described: clustered
                  .map((s) => `${s.name}: ${Array.from(s.y, (v) => fixed(v, 1)).join(', ')}`)
                  .join('. '),
                xSays: 'generation',
                ySays: 'standard deviations from chance',
                xNames: String,
                yNames: (v) => num(v),
                against: 0,
                xTicks: ticks(last),
              }),
              `How far ties between frustrated households exceed chance.${bandWords(e)}`,
            )
      }</div>`,
  };
}

function wealth(e: Evidence): Section | null {
  const { cube, study } = e;
  const T = study.generations;
  const gini = seriesOf(e, 'gini', 0, T);
  const words = gini.map(
    (s) => `in ${quoted(s.name)} the Gini of wealth goes from ${fixed(s.y[0], 2)} to ${fixed(s.y[T], 2)}`,
  );
  const mean = cube.arms.map(
    (name, a) => `${num(cube.mean('mean_wealth', a, 0))} to ${num(cube.mean('mean_wealth', a, T))} in ${quoted(name)}`,
  );
  const plates: string[] = [];
  const shown = e.shown;
  if (shown !== null && shown.arms.length >= 2) {
    for (const other of shown.arms.slice(1, 4)) {
      const left = shown.arms[0];
      other.moments.forEach((right, k) => {
        plates.push(
          plate(
            densitiesFigure(
              { width: 300, height: 290 },
              armWealth(left, left.moments[k]),
              armWealth(other, right),
              `Wealth of ${left.name} and ${other.name}, generation ${right.generation}`,
            ),
            `Generation ${right.generation}.`,
          ),
        );
      });
    }
  } else if (shown !== null) {
    const [only] = shown.arms;
    for (const moment of only.moments.slice(1)) {
      const named = (m: Moment) => ({ ...armWealth(only, m), name: `generation ${m.generation}` });
      plates.push(
        plate(
          densitiesFigure(
            { width: 300, height: 290 },
            named(only.moments[0]),
            named(moment),
            `Wealth in generations ${only.moments[0].generation} and ${moment.generation}`,
          ),
          `Generation ${only.moments[0].generation} on the left, ${moment.generation} on the right.`,
        ),
      );
    }
  }
  return {
    id: 'wealth',
    title: 'Wealth and inequality',
    html:
      p(
        `Mean wealth goes from ${list(mean)} (${study.currency}). ${sentence(words.join('; '))}; 0 is equality, 1 is everything in one hand.`,
      ) +
      (plates.length === 0
        ? ''
        : p(
            `Who has what, on a scale where equal steps are equal ratios: households per step of wealth, the frustrated in ` +
              `vermillion next to the axis, the satisfied in blue outside them, the median dashed. ${shownWords(e)}`,
          ) + `<div class="plates three">${plates.join('')}</div>`) +
      `<div class="plates">${plate(
        linesFigure({ width: WIDE, height: 250 }, gini, {
          title: 'Gini of wealth, by generation',
          described: gini.map((s) => `${s.name}: ${Array.from(s.y, (v) => fixed(v, 2)).join(', ')}`).join('. '),
          xSays: 'generation',
          ySays: 'Gini',
          xNames: String,
          yNames: (v) => fixed(v, 2),
          xTicks: ticks(T),
        }),
        `Inequality of wealth.${bandWords(e)}`,
      )}${contrastPlates(e, 'gini', T, { what: 'Gini of wealth', says: 'Gini', names: (v) => fixed(v, 3) })}</div>`,
  };
}

function armWealth(arm: ArmShown, moment: Moment): { name: string; wealth: Float64Array; met: Uint8Array } {
  return { name: arm.name, wealth: moment.wealth, met: moment.met };
}

function shownWords(e: Evidence): string {
  if (e.shown === null) return '';
  if (e.cube.replicates === 1) return '';
  return e.cube.arms.length > 1
    ? `Drawn for replicate ${e.shown.replicate}, whose difference between the arms is nearest to the mean over replicates.`
    : `Drawn for replicate ${e.shown.replicate}, the one nearest to the mean over replicates.`;
}

function growth(e: Evidence): Section | null {
  if (e.incidence.count === 0) return null;
  const curve = (arm: string, t: number, y: string, se: string): Series => {
    const rows: { x: number; y: number; se: number }[] = [];
    for (let k = 0; k < e.incidence.count; k++) {
      if (e.incidence.text('arm', k) !== arm || e.incidence.number('generation', k) !== t) continue;
      rows.push({
        x: e.incidence.number('percentile', k),
        y: e.incidence.number(y, k),
        se: e.incidence.number(se, k),
      });
    }
    return {
      name: arm,
      x: rows.map((r) => r.x),
      y: rows.map((r) => r.y),
      low: rows.map((r) => r.y - 1.96 * r.se),
      high: rows.map((r) => r.y + 1.96 * r.se),
    };
  };
  const mean = (s: Series, from: number, to: number): number => {
    const values = Array.from(s.y).filter((v, k) => s.x[k] > from && s.x[k] < to && Number.isFinite(v));
    return values.reduce((sum, v) => sum + v, 0) / values.length;
  };
  const t = e.telling;
  const byRank = e.cube.arms.map((arm) => curve(arm, t, 'growth_by_initial_rank', 'mc_se_by_initial_rank'));
  const words = byRank.map(
    (s) =>
      `in ${quoted(s.name)} the poorest tenth pass on ${fixed(mean(s, 0, 10), 2)} times what they have and the richest tenth ${fixed(mean(s, 90, 100), 2)} times`,
  );
  const draw = (series: Series[], title: string): string =>
    linesFigure({ width: WIDE, height: 270 }, series, {
      title,
      described: series
        .map(
          (s) =>
            `${s.name}: poorest tenth ${fixed(mean(s, 0, 10), 2)}, middle ${fixed(mean(s, 45, 55), 2)}, richest tenth ${fixed(mean(s, 90, 100), 2)}`,
        )
        .join('. '),
      xSays: 'percentile of wealth',
      ySays: 'growth factor',
      xNames: (v) => num(v),
      yNames: (v) => num(v),
      against: 1,
      xRange: [0, 100],
      xTicks: [0, 20, 40, 60, 80, 100],
    });
  const anonymous = (generation: number): string =>
    plate(
      draw(
        e.cube.arms.map((arm) => curve(arm, generation, 'growth', 'mc_se')),
        `Growth incidence, generation ${generation} to ${generation + 1}`,
      ),
      `Growth of each percentile of wealth from generation ${generation} to ${generation + 1}, whoever is in it.`,
    );
  return {
    id: 'growth',
    title: 'Who grows',
    html:
      p(
        `From generation ${t} to ${t + 1}, ${words.join('; ')}. A factor of 1 is standing still; over ${num(e.study.years_per_generation)} years a factor of 2 is ${pct(2 ** (1 / e.study.years_per_generation) - 1, 1)} a year.`,
      ) +
      `<div class="plates">${anonymous(t)}${plate(
        draw(byRank, `Growth by initial rank, generation ${t} to ${t + 1}`),
        `Growth of the families that were in each percentile in generation ${t}, wherever they ended. Bands in both: 95 % interval over replicates.`,
      )}</div>`,
  };
}

function mobility(e: Evidence): Section | null {
  const T = e.study.generations;
  if (e.transitions.count === 0) return null;
  const t = e.telling;
  const near = spanOf(e, t, t + 1);
  const words = near.map(
    ({ name, share }) =>
      `${pct(share[0])} stay there and ${pct(share[3] + share[4])} come among the richer two fifths in ${quoted(name)}`,
  );
  const slopes = has(e, 'rank_rank_slope')
    ? ` A child’s rank follows the parent’s with a slope of ${list(
        e.cube.arms.map((name, a) => `${fixed(e.cube.mean('rank_rank_slope', a, t + 1), 2)} in ${quoted(name)}`),
      )} (0: origin does not matter, 1: it decides all).`
    : '';
  const draw = (arms: readonly Transition[], from: number, to: number): string => {
    const pairs: Transition[][] = [];
    for (let k = 0; k < arms.length; k += 2) pairs.push(arms.slice(k, k + 2));
    return pairs
      .map((pair) =>
        plate(
          transitionsFigure(
            { width: WIDE, height: pair.length > 1 ? 220 : 300 },
            pair,
            `Transitions between fifths of wealth, generation ${from} to ${to}: ${list(pair.map((arm) => arm.name))}`,
          ),
          `In each row, where 100 families of one fifth of generation ${from} (richest on top) are in generation ${to}. Mean over replicates.`,
        ),
      )
      .join('');
  };
  return {
    id: 'mobility',
    title: 'Moving up and down',
    html:
      p(
        `Of the families in the poorest fifth in generation ${t}, one generation later ${words.join('; ')}.${slopes}` +
          (T > 1 ? ` Over all ${count(T, 'generation')} the origin is ${originWords(spanOf(e, 0, T))}.` : ''),
      ) + `<div class="plates">${draw(near, t, t + 1)}${T > 1 ? draw(spanOf(e, 0, T), 0, T) : ''}</div>`,
  };
}

/** Shares of a span of generations, an arm each. */
function spanOf(e: Evidence, from: number, to: number): Transition[] {
  const { transitions } = e;
  return e.cube.arms.map((name) => {
    const share = new Float64Array(25).fill(NaN);
    for (let k = 0; k < transitions.count; k++) {
      if (transitions.text('arm', k) !== name) continue;
      if (transitions.number('from_generation', k) !== from || transitions.number('to_generation', k) !== to) continue;
      const at = 5 * (transitions.number('from_quintile', k) - 1) + transitions.number('to_quintile', k) - 1;
      share[at] = transitions.number('share', k);
    }
    return { name, share };
  });
}

/** How much of the origin is left: what stays in the poorest fifth against the 20 % of chance. */
function originWords(arms: readonly Transition[]): string {
  const kept = arms.map(({ share }) => share[0]);
  if (kept.every((v) => v < 0.25)) return 'nearly forgotten';
  return `still there: ${list(arms.map(({ name, share }) => `${pct(share[0])} of the poorest fifth’s descendants are in it in ${quoted(name)}`))}, where 20 % would show no trace`;
}

function networks(e: Evidence): Section | null {
  const rows: string[][] = [];
  const add = (label: string, cell: (arm: string, a: number) => string): void => {
    rows.push([label, ...e.cube.arms.map(cell)]);
  };
  const reached = (arm: string, key: string): number => {
    const notes = e.networks[arm] ?? [];
    const values = notes.map((note) => note.reached[key]).filter((v) => typeof v === 'number' && Number.isFinite(v));
    return values.length === 0 ? NaN : values.reduce((sum, v) => sum + v, 0) / values.length;
  };
  if (Object.keys(e.networks).length > 0) {
    add('ties a household', (arm) => fixed(reached(arm, 'mean_degree'), 1));
    if (places(e) > 1) add('ties within the place', (arm) => pct(reached(arm, 'within_place')));
  }
  for (const [indicator, label] of [
    ['assortativity_place', 'segregation by place (assortativity; 0 none, 1 complete)'],
    ['assortativity_group', 'segregation by group (assortativity)'],
    ['assortativity_rank', 'segregation by wealth (assortativity of rank)'],
    ['economic_connectedness', 'economic connectedness (1: the poor have as many rich ties as everyone)'],
    ['e_i_group', 'E–I index of groups (−1 all ties within, +1 all between)'],
  ] as const) {
    if (has(e, indicator)) add(label, (_arm, a) => fixed(e.cube.mean(indicator, a, 0), 2));
  }
  const drawn = e.shown?.arms.every((arm) => arm.positions !== null) ? mapPlates(e) : '';
  const tooMany =
    e.shown !== null && drawn === ''
      ? p(`More than ${grouped(MAP_LIMIT)} households make no map that can be read; the viewer shows them.`, 'note')
      : '';
  const byWealth = ladderPlates(e);
  if (rows.length === 0 && drawn === '') return null;
  return {
    id: 'networks',
    title: e.cube.arms.length === 2 ? 'The two networks' : 'The networks',
    html:
      (rows.length === 0 ? '' : table('How the networks differ, at the start', ['', ...e.cube.arms], rows)) +
      drawn +
      tooMany +
      byWealth,
  };
}

function places(e: Evidence): number {
  return e.study.population.places?.count ?? 1;
}

function mapPlates(e: Evidence): string {
  const shown = e.shown;
  if (shown === null) return '';
  const most = Math.floor(TIES_DRAWN / shown.arms.length);
  const marks = Math.floor(MARKS_DRAWN / (shown.arms.length * shown.arms[0].moments.length));
  const out: string[] = [];
  let thinned = false;
  shown.arms.forEach((arm, a) => {
    const { positions } = arm;
    if (positions === null) return;
    const defined = new Map<unknown, string>();
    const cells = arm.moments.map((moment) => {
      let id: string | null = null;
      if (moment.ties !== null) {
        id = defined.get(moment.ties) ?? null;
        if (id === null) {
          id = `ties-${a}-${moment.generation}`;
          defined.set(moment.ties, id);
          const { source, target } = toPairs(moment.ties);
          const made = tiesDefinition(id, positions, source, target, most);
          if (made.drawn < source.length) thinned = true;
          out.push(made.svg);
        }
      }
      let frustrated = 0;
      for (const m of moment.met) if (m === 0) frustrated++;
      const share = frustrated / Math.max(1, moment.met.length);
      if (moment.household.length > marks) thinned = true;
      return plate(
        networkFigure(
          { positions, household: moment.household, met: moment.met },
          id,
          marks,
          `Network of ${arm.name}, generation ${moment.generation}`,
          `Households near those they have ties to; ${pct(share)} frustrated, drawn as open rings.`,
        ),
        `Generation ${moment.generation}: ${pct(share)} frustrated`,
      );
    });
    out.push(
      `<section class="field" aria-label="${safe(arm.name)}"><h3>${safe(arm.name)}</h3><div class="plates maps">${cells.join('')}</div>${p(honest(e, arm), 'note')}</section>`,
    );
  });
  return (
    p(
      `Each household is a mark, near those it has ties to: a filled blue disc is satisfied, an open vermillion ring frustrated. ` +
        `The drawing knows the ties only, not places, groups or wealth; the few that lie far out stand at the edge. ${shownWords(e)}` +
        (thinned ? ' Of so many, evenly chosen households and ties are drawn.' : ''),
    ) + out.join('\n')
  );
}

/** Households by place and wealth. */
function ladderPlates(e: Evidence): string {
  const shown = e.shown;
  if (shown === null || shown.arms.some((arm) => arm.sideways === null)) return '';
  let low = Infinity;
  let high = -Infinity;
  for (const { moments } of shown.arms)
    for (const { wealth } of moments)
      for (const w of wealth) {
        if (!(w > 0)) continue;
        if (w < low) low = w;
        if (w > high) high = w;
      }
  const range = [Math.log(low), Math.log(high)] as const;
  const cells = shown.arms.flatMap(({ name, moments, sideways }) =>
    moments.map(({ generation, wealth, met }) => {
      const step = Math.max(1, Math.ceil(wealth.length / LADDER_MARKS));
      const kept = Array.from({ length: Math.ceil(wealth.length / step) }, (_, k) => k * step);
      return plate(
        fieldFigure(
          { width: 300, height: 260 },
          {
            name,
            sideways: kept.map((i) => sideways?.[i] ?? 0),
            wealth: kept.map((i) => wealth[i]),
            met: kept.map((i) => met[i]),
          },
          range,
          `Households of ${name} by place and wealth, generation ${generation}`,
        ),
        `Generation ${generation}.`,
      );
    }),
  );
  const thinned = shown.arms[0].moments[0].wealth.length > LADDER_MARKS;
  return (
    '<h3>The same households by place and wealth</h3>' +
    p(
      `Height is wealth${places(e) > 1 ? ', and places stand side by side, those poorer at the start on the left' : ''}; ` +
        `a filled disc is satisfied, an open ring frustrated.${thinned ? ' Of so many, evenly chosen households are drawn.' : ''} ${shownWords(e)}`,
    ) +
    `<div class="plates three">${cells.join('')}</div>`
  );
}

/** The share of drawn neighbours that are alike beside the share of ties. */
function honest(e: Evidence, arm: ArmShown): string {
  const first = arm.moments[0].ties;
  if (arm.positions === null || first === null) return '';
  const parts: string[] = [];
  if (arm.group.names.length > 1) {
    parts.push(
      `of the same group: ${pct(drawnSameGroupShare(arm.positions, arm.group.codes))} of drawn neighbours, ${pct(tiedSameGroupShare(first, arm.group.codes))} of ties`,
    );
  }
  if (places(e) > 1 || new Set(arm.place).size > 1) {
    parts.push(
      `of the same place: ${pct(drawnSameGroupShare(arm.positions, arm.place))} of drawn neighbours, ${pct(tiedSameGroupShare(first, arm.place))} of ties`,
    );
  }
  return parts.length === 0 ? '' : `How far the drawing tells the truth: ${parts.join('; ')}.`;
}

interface PocketRow extends PocketMoment {
  readonly fringe: number;
  readonly places: number;
  readonly meanWealth: number;
  readonly event: string;
  readonly local: number;
  readonly general: number;
}

function pocketRows(e: Evidence, arm: string, replicate: number): PocketRow[] {
  const rows: PocketRow[] = [];
  const { pockets: t } = e;
  for (let k = 0; k < t.count; k++) {
    if (t.number('replicate', k) !== replicate || t.text('arm', k) !== arm) continue;
    const size = t.number('size', k);
    if (!(size > 0)) continue;
    const parent = t.number('parent', k);
    rows.push({
      pocket: t.number('pocket', k),
      generation: t.number('generation', k),
      size,
      pValue: t.number('p_value', k),
      parent: Number.isNaN(parent) ? -1 : parent,
      fringe: t.number('fringe', k),
      places: t.number('places', k),
      meanWealth: t.number('mean_wealth', k),
      event: t.text('event', k),
      local: t.number('local', k),
      general: t.number('general', k),
    });
  }
  return rows;
}

/** Pockets listed of each arm. */
const POCKETS_LISTED = 6;
/** Level at which a pocket counts as more than chance. */
const LEVEL = 0.05;

function pockets(e: Evidence): Section | null {
  if (e.pockets.count === 0) return null;
  const replicate = e.shown?.replicate ?? 0;
  const T = e.study.generations;
  const { pockets: t, cube } = e;
  const words = cube.arms.map((arm, a) => {
    const seen = new Set<number>();
    const sure = new Set<number>();
    let first = Infinity;
    for (let k = 0; k < t.count; k++) {
      if (t.text('arm', k) !== arm || !(t.number('size', k) > 0)) continue;
      const r = t.number('replicate', k);
      seen.add(r);
      if (t.number('p_value', k) <= LEVEL) {
        sure.add(r);
        first = Math.min(first, t.number('generation', k));
      }
    }
    if (seen.size === 0) return `no pocket appears in ${quoted(arm)}`;
    const number = has(e, 'pockets') ? cube.mean('pockets', a, e.telling) : NaN;
    return (
      `in ${quoted(arm)} pockets appear in ${seen.size} of ${count(cube.replicates, 'replicate')}` +
      `${Number.isNaN(number) ? '' : `, ${fixed(number, 1)} on average in generation ${e.telling}`}, ` +
      (e.study.pockets.permutations === 0
        ? 'not tested against chance (the study makes no permutations)'
        : sure.size === 0
          ? 'none of them larger than chance explains'
          : `and in ${sure.size} some are larger than chance explains (p at most 0.05), the first in generation ${first}`)
    );
  });
  const plates: string[] = [];
  const listed: string[][] = [];
  for (const arm of cube.arms) {
    const rows = pocketRows(e, arm, replicate);
    if (rows.length === 0) continue;
    const height = Math.max(140, Math.min(330, 40 + 24 * new Set(rows.map((row) => row.pocket)).size));
    plates.push(
      plate(
        lifelinesFigure({ width: WIDE, height }, rows, {
          title: `Life lines of pockets in ${arm}, replicate ${replicate}`,
          generations: T,
        }),
        `Pockets of ${quoted(arm)} in replicate ${replicate}: a band lasts as long as its pocket and is as high as it is large; hollow bands are not more than chance.`,
      ),
    );
    const lives = new Map<number, PocketRow[]>();
    for (const row of rows) lives.set(row.pocket, [...(lives.get(row.pocket) ?? []), row]);
    const largest = [...lives.values()]
      .map((life) => ({
        life,
        top: life.reduce((best, row) => (row.size > best.size ? row : best)),
        sure: Number(life.some((row) => row.pValue <= LEVEL)),
      }))
      .sort((x, y) => y.sure - x.sure || y.top.size - x.top.size || x.top.pocket - y.top.pocket)
      .slice(0, POCKETS_LISTED);
    for (const { life, top } of largest) {
      const caused = top.local + top.general;
      listed.push([
        `${arm}, pocket ${top.pocket}`,
        `${life[0].generation}–${life[life.length - 1].generation}`,
        grouped(top.size),
        grouped(top.fringe),
        grouped(top.places),
        num(top.meanWealth),
        caused > 0 ? pct(top.local / caused) : '–',
        pValue(Math.min(...life.map((row) => row.pValue))),
      ]);
    }
  }
  return {
    id: 'pockets',
    title: 'Pockets: local aspiration traps',
    html:
      p(
        'A pocket is a connected set of households that have stayed frustrated and whose ties are mostly frustrated too. Whether it is more than chance is tested by reshuffling who is frustrated: with many ties, large sets of frustrated households appear by chance alone.',
      ) +
      p(`${sentence(words.join('; '))}.`) +
      `<div class="plates">${plates.join('')}</div>` +
      (listed.length === 0
        ? ''
        : table(
            `Pockets of replicate ${replicate}, those beyond chance first, then the largest; each when it was largest`,
            ['', 'generations', 'core', 'fringe', 'places', `mean wealth`, 'local cause', 'least p'],
            listed,
          ) +
          p(
            'Local cause: share of members who would meet a milestone if they looked to society’s mean instead of those around them.',
            'note',
          )),
  };
}

function regimes(e: Evidence): Section | null {
  if (e.regimes.count === 0) return null;
  const rows = e.cube.arms.flatMap((arm) => {
    const counts = new Map<string, number>();
    for (let k = 0; k < e.regimes.count; k++) {
      if (e.regimes.text('arm', k) !== arm) continue;
      const regime = e.regimes.text('regime', k);
      counts.set(regime, (counts.get(regime) ?? 0) + 1);
    }
    return [...counts]
      .sort((a, b) => b[1] - a[1] || (a[0] < b[0] ? -1 : 1))
      .map(([regime, n]) => [arm, regime, `${n} of ${e.cube.replicates}`]);
  });
  return {
    id: 'regimes',
    title: 'Where it is heading',
    html:
      p(
        'Judged by the last third of the generations: converging (the spread of wealth falls toward nothing), widening (it rises), settled with one or more modes, cycling, declining, or undecided when the horizon is too short to tell.',
      ) + table('Regime of each arm', ['arm', 'regime', 'replicates'], rows, { words: [1] }),
  };
}
