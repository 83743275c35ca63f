/**
 * The Distribution panel: growth incidence, transitions, rank–rank and Lorenz, both arms on the same axes, with the
 * band of the replicates.
 */
import { html, type TemplateResult } from 'lit-html';
import { linesFigure, type Series } from '../../sim/results/figures/lines.js';
import { type Transition, transitionsFigure } from '../../sim/results/figures/transitions.js';
import { numbers, type Table, text } from '../data/source.js';
import type { App } from '../screen/app.js';
import { Fresh } from './fresh.js';
import { shown, units } from './show.js';

/** Replicates whose households are read for the bands of the rank–rank and Lorenz curves. */
const BAND = 12;
const BAND_ROWS = 500000;
const STEPS = 20;

interface Curves {
  readonly rank: { readonly y: Float64Array; readonly low: Float64Array; readonly high: Float64Array };
  readonly lorenz: { readonly y: Float64Array; readonly low: Float64Array; readonly high: Float64Array };
  readonly replicates: number;
}

interface Data {
  readonly names: readonly string[];
  readonly generation: number;
  readonly curves: readonly Curves[];
  readonly incidence: readonly Series[];
  readonly transitions: readonly Transition[];
}

const data = new Fresh<Data>();

/** Mean child rank by parent rank, and the Lorenz curve of the parents, at STEPS + 1 even points. */
export function curvesOf(wealth: Float64Array, child: Float64Array): { rank: Float64Array; lorenz: Float64Array } {
  const n = wealth.length;
  const byWealth = Uint32Array.from(wealth, (_, i) => i).sort((a, b) => wealth[a] - wealth[b]);
  const childOrder = Uint32Array.from(child, (_, i) => i).sort((a, b) => child[a] - child[b]);
  const childRank = new Float64Array(n);
  childOrder.forEach((i, k) => {
    childRank[i] = n > 1 ? k / (n - 1) : 0.5;
  });
  const rank = new Float64Array(STEPS);
  const count = new Float64Array(STEPS);
  const lorenz = new Float64Array(STEPS + 1);
  let sum = 0;
  let at = 1;
  byWealth.forEach((i, k) => {
    const bin = Math.min(STEPS - 1, Math.floor((k / n) * STEPS));
    rank[bin] += childRank[i];
    count[bin]++;
    sum += wealth[i];
    while (at <= STEPS && (k + 1) / n >= at / STEPS) lorenz[at++] = sum;
  });
  for (let k = 0; k < STEPS; k++) rank[k] /= Math.max(1, count[k]);
  for (let k = 0; k <= STEPS; k++) lorenz[k] /= sum > 0 ? sum : 1;
  return { rank, lorenz };
}

async function load(app: App): Promise<Data> {
  const { view, source } = app;
  const { info } = source;
  const t = Math.min(view.generation, info.generations - 1);
  const arms = view.left === view.right ? [view.left] : [view.left, view.right];
  const many = Math.max(1, Math.min(BAND, info.shown.length, Math.floor(BAND_ROWS / info.households)));
  const replicates = [view.replicate, ...info.shown.filter((r) => r !== view.replicate)].slice(0, many);
  const curves: Curves[] = [];
  for (const arm of arms) {
    const all: { rank: Float64Array; lorenz: Float64Array }[] = [];
    for (const r of replicates) {
      const s = await app.loader.snapshot(arm, r, t);
      all.push(curvesOf(s.wealth, s.childWealth));
    }
    const band = (pick: (c: { rank: Float64Array; lorenz: Float64Array }) => Float64Array) => {
      const y = pick(all[0]);
      const at = (k: number): number[] => all.map((c) => pick(c)[k]);
      return { y, low: y.map((_, k) => Math.min(...at(k))), high: y.map((_, k) => Math.max(...at(k))) };
    };
    curves.push({ rank: band((c) => c.rank), lorenz: band((c) => c.lorenz), replicates: all.length });
  }
  const names = arms.map((arm) => info.arms[arm].name);
  const [incidence, transitions] = await Promise.all([source.table('incidence'), source.table('transitions')]);
  return {
    names,
    generation: t,
    curves,
    incidence: incidence === null ? [] : names.map((name) => incidenceOf(incidence, name, t)),
    transitions: transitions === null ? [] : names.map((name) => transitionOf(transitions, name, t)),
  };
}

function incidenceOf(table: Table, arm: string, generation: number): Series {
  const arms = text(table, 'arm');
  const gen = numbers(table, 'generation');
  const percentile = numbers(table, 'percentile');
  const growth = numbers(table, 'growth');
  const se = numbers(table, table.columns.mc_se === undefined ? 'growth_mc_se' : 'mc_se');
  const rows: { x: number; y: number; se: number }[] = [];
  for (let k = 0; k < table.rows; k++) {
    if (arms[k] === arm && gen[k] === generation) rows.push({ x: percentile[k], y: growth[k], se: se[k] });
  }
  rows.sort((a, b) => a.x - b.x);
  return {
    name: arm,
    x: rows.map((r) => r.x),
    y: rows.map((r) => r.y),
    low: rows.map((r) => r.y - 1.96 * r.se),
    high: rows.map((r) => r.y + 1.96 * r.se),
  };
}

function transitionOf(table: Table, arm: string, generation: number): Transition {
  const arms = text(table, 'arm');
  const from = numbers(table, table.columns.from_generation !== undefined ? 'from_generation' : 'generation');
  const to = numbers(table, 'to_generation');
  const hasTo = table.columns.to_generation !== undefined;
  const row = numbers(table, table.columns.from_quintile !== undefined ? 'from_quintile' : 'parent_quintile');
  const column = numbers(table, table.columns.to_quintile !== undefined ? 'to_quintile' : 'child_quintile');
  const value = numbers(table, 'share');
  const sum = new Float64Array(25);
  const count = new Float64Array(25);
  let base = Infinity;
  for (let k = 0; k < table.rows; k++) base = Math.min(base, row[k]);
  for (let k = 0; k < table.rows; k++) {
    if (arms[k] !== arm || from[k] !== generation || (hasTo && to[k] !== generation + 1)) continue;
    const at = 5 * (row[k] - base) + (column[k] - base);
    sum[at] += value[k];
    count[at]++;
  }
  const share = sum.map((s, k) => (count[k] > 0 ? s / count[k] : NaN));
  // shares of all households add up to 1, shares of a row to 5: show them by row
  for (let r = 0; r < 5; r++) {
    let total = 0;
    for (let c = 0; c < 5; c++) total += share[5 * r + c];
    if (total > 0) for (let c = 0; c < 5; c++) share[5 * r + c] /= total;
  }
  return { name: arm, share };
}

export function distributionPanel(app: App): TemplateResult {
  const { view } = app;
  const got = data.get(
    `${app.sourceCount}/${view.left}/${view.right}/${view.replicate}/${view.generation}`,
    () => load(app),
    () => app.render(),
  );
  if (got === undefined) return html`<p class="note">${data.failed ?? 'Reading the distribution …'}</p>`;
  const quarter = units(app, 0.25, 18);
  const size = { width: quarter.width, height: quarter.height - 22 };
  const t = got.generation;
  const even = Array.from({ length: STEPS + 1 }, (_, k) => k / STEPS);
  const middles = Array.from({ length: STEPS }, (_, k) => (k + 0.5) / STEPS);
  const percents = (v: number): string => String(Math.round(v * 100));
  const of = got.curves[0].replicates;
  const bandSays = of > 1 ? `; band: the extremes of ${of} replicates` : '';
  const figures: TemplateResult[] = [];
  if (got.incidence.some((s) => s.x.length > 0)) {
    figures.push(
      shown(
        app,
        `growth-incidence-${t}`,
        'Growth by percentile',
        linesFigure(size, got.incidence, {
          title: `Growth incidence, generation ${t}`,
          described: `Growth factor of each percentile of wealth from generation ${t} to ${t + 1}, mean of all replicates with 95 % Monte-Carlo band.`,
          xSays: 'percentile of wealth',
          xRange: [0, 100],
          xTicks: [0, 50, 100],
          ySays: 'growth factor',
          xNames: (v) => String(v),
          yNames: (v) => String(Number(v.toPrecision(3))),
          against: 1,
        }),
      ),
    );
  }
  if (got.transitions.some((tr) => tr.share.length > 0 && Number.isFinite(tr.share[0]))) {
    figures.push(
      shown(
        app,
        `transitions-${t}`,
        'Quintiles, parent to child, %',
        transitionsFigure(size, got.transitions, `Transitions between quintiles, generation ${t} to ${t + 1}`),
      ),
    );
  }
  figures.push(
    shown(
      app,
      `rank-rank-${t}`,
      'Child’s rank by parent’s rank',
      linesFigure(
        size,
        got.names.map((name, k) => ({ name, x: middles, ...got.curves[k].rank })),
        {
          title: `Rank–rank plot, generation ${t}`,
          described: `Mean wealth percentile of the children by percentile of the parents, generation ${t}${bandSays}. Dotted: no mobility.`,
          xSays: 'parent’s percentile',
          ySays: 'child’s percentile',
          xNames: percents,
          yNames: percents,
          xRange: [0, 1],
          yRange: [0, 1],
          diagonal: 'no mobility',
        },
      ),
    ),
    shown(
      app,
      `lorenz-${t}`,
      'Lorenz curve',
      linesFigure(
        size,
        got.names.map((name, k) => ({ name, x: even, ...got.curves[k].lorenz })),
        {
          title: `Lorenz curve, generation ${t}`,
          described: `Share of wealth held by the poorest share of households, generation ${t}${bandSays}. Dotted: equality.`,
          xSays: 'poorest households, %',
          ySays: 'share of wealth, %',
          xNames: percents,
          yNames: percents,
          xRange: [0, 1],
          yRange: [0, 1],
          diagonal: 'equality',
        },
      ),
    ),
  );
  return html`<div class=${`figures count-${figures.length}${data.current ? '' : ' stale'}`}>${figures}</div>`;
}
