/**
 * The Contrasts panel: every indicator, arm against arm, over all replicates of the study and not only the one shown.
 */
import { html, nothing, svg, type TemplateResult } from 'lit-html';
import { short } from '../../sim/results/figures/figure.js';
import { linesFigure, type Series } from '../../sim/results/figures/lines.js';
import { numbers, type Table, text } from '../data/source.js';
import type { App } from '../screen/app.js';
import { Fresh } from './fresh.js';
import { shown, units } from './show.js';

interface Row {
  readonly indicator: string;
  readonly difference: number;
  readonly low: number;
  readonly high: number;
  readonly p: number;
  readonly left: number;
  readonly right: number;
}

interface Data {
  readonly rows: readonly Row[];
  readonly replicates: number;
  readonly paths: ReadonlyMap<string, readonly Series[]>;
}

const data = new Fresh<Data>();
let chosen = 'share_frustrated';

/** Mean and spread over replicates of every indicator, by generation. */
function path(table: Table, indicator: string, arm: string, generations: number): Series {
  const arms = text(table, 'arm');
  const gen = numbers(table, 'generation');
  const value = numbers(table, indicator);
  const sum = new Float64Array(generations + 1);
  const square = new Float64Array(generations + 1);
  const count = new Float64Array(generations + 1);
  for (let k = 0; k < table.rows; k++) {
    if (arms[k] !== arm || !Number.isFinite(value[k]) || !(gen[k] <= generations)) continue;
    sum[gen[k]] += value[k];
    square[gen[k]] += value[k] * value[k];
    count[gen[k]]++;
  }
  const mean = sum.map((s, t) => (count[t] > 0 ? s / count[t] : NaN));
  const spread = square.map((s, t) => (count[t] > 1 ? Math.sqrt(Math.max(0, s / count[t] - mean[t] * mean[t])) : 0));
  return {
    name: arm,
    x: Array.from({ length: generations + 1 }, (_, t) => t),
    y: mean,
    low: mean.map((m, t) => m - spread[t]),
    high: mean.map((m, t) => m + spread[t]),
  };
}

async function load(app: App): Promise<Data> {
  const { view, source } = app;
  const { info } = source;
  const names = [info.arms[view.left].name, info.arms[view.right].name];
  const [contrasts, indicators] = await Promise.all([source.table('contrasts'), source.table('indicators')]);
  if (indicators === null) return { rows: [], replicates: 0, paths: new Map() };
  const labels = new Set(['arm', 'replicate', 'generation']);
  const all = Object.keys(indicators.columns).filter(
    (name) => !labels.has(name) && indicators.columns[name] instanceof Float64Array,
  );
  const paths = new Map(all.map((name) => [name, names.map((arm) => path(indicators, name, arm, info.generations))]));
  const t = view.generation;
  const found = new Map<string, { difference: number; low: number; high: number; p: number }>();
  let replicates = info.replicates;
  if (contrasts !== null) {
    const arm = text(contrasts, 'arm');
    const base = text(contrasts, 'baseline');
    const indicator = text(contrasts, 'indicator');
    const generation = numbers(contrasts, 'generation');
    const [difference, low, high, p, count] = ['difference', 'ci_low', 'ci_high', 'p_value', 'replicates'].map((name) =>
      numbers(contrasts, name),
    );
    for (let k = 0; k < contrasts.rows; k++) {
      if (generation[k] !== t) continue;
      if (count[k] > 0) replicates = count[k];
      // right against left, turned round when the results hold the pair the other way
      if (arm[k] === names[1] && base[k] === names[0])
        found.set(indicator[k], { difference: difference[k], low: low[k], high: high[k], p: p[k] });
      else if (arm[k] === names[0] && base[k] === names[1])
        found.set(indicator[k], { difference: -difference[k], low: -high[k], high: -low[k], p: p[k] });
    }
  }
  const rows = all
    .map((indicator): Row => {
      const [a, b] = paths.get(indicator) as readonly Series[];
      const c = found.get(indicator);
      return {
        indicator,
        left: a.y[t],
        right: b.y[t],
        difference: c?.difference ?? b.y[t] - a.y[t],
        low: c?.low ?? NaN,
        high: c?.high ?? NaN,
        p: c?.p ?? NaN,
      };
    })
    .filter((r) => Number.isFinite(r.left) || Number.isFinite(r.right));
  return { rows, replicates, paths };
}

/** Indicators whose name in the tables does not read as words. */
const NAMES: Readonly<Record<string, string>> = {
  gini: 'Gini',
  theil_t: 'Theil T',
  theil_l: 'Theil L',
  theil_t_between_places: 'Theil T between places',
  theil_t_between_groups: 'Theil T between groups',
  atkinson_half: 'Atkinson (½)',
  atkinson_1: 'Atkinson (1)',
  atkinson_2: 'Atkinson (2)',
  share_bottom_40: 'share of the bottom 40 %',
  share_top_10: 'share of the top 10 %',
  p90_p10: 'P90 / P10',
  palma: 'Palma ratio',
  esteban_ray: 'Esteban–Ray',
  der_half: 'Duclos–Esteban–Ray (½)',
  wolfson: 'Wolfson',
  dip: 'dip',
  dip_p: 'dip, p',
  rank_rank_slope: 'rank–rank slope',
  join_count_z: 'join count, z',
  join_count_p: 'join count, p',
  moran: 'Moran’s I',
  moran_expected: 'Moran’s I expected',
  moran_p: 'Moran’s I, p',
  coleman_group: 'Coleman homophily',
  e_i_group: 'E–I index',
  pocket_p: 'pockets, p',
};

export function inWords(indicator: string): string {
  return NAMES[indicator] ?? indicator.replaceAll('_', ' ');
}

/** The interval against zero, on its own scale: which side it lies on and how surely. */
function interval(r: Row): TemplateResult {
  if (!Number.isFinite(r.low) || !Number.isFinite(r.high)) return html``;
  const most = Math.max(Math.abs(r.low), Math.abs(r.high)) || 1;
  const x = (v: number): number => 50 + (v / most) * 44;
  const clear = r.low > 0 || r.high < 0;
  return html`<svg class="interval" viewBox="0 0 100 14" aria-hidden="true">${svg`
    <line class="zero" x1="50" x2="50" y1="0" y2="14"></line>
    <line class="span" x1=${x(r.low)} x2=${x(r.high)} y1="7" y2="7"></line>
    <circle class=${clear ? 'clear' : 'open'} cx=${x(r.difference)} cy="7" r="3.4"></circle>`}</svg>`;
}

export function contrastsPanel(app: App): TemplateResult {
  const { view } = app;
  const { info } = app.source;
  const got = data.get(
    `${app.sourceCount}/${view.left}/${view.right}/${view.generation}`,
    () => load(app),
    () => app.render(),
  );
  if (got === undefined) return html`<p class="note">${data.failed ?? 'Reading the contrasts …'}</p>`;
  const [a, b] = [info.arms[view.left].name, info.arms[view.right].name];
  const size = units(app, 0.4, 20);
  const alone = view.left === view.right;
  const path = got.paths.get(chosen) ?? got.paths.values().next().value;
  const series = alone ? path?.slice(0, 1) : path;
  return html`<div class="contrasts">
    <div class="scrolls" tabindex="0" role="group" aria-label="Indicators">
      <table class="list">
        <thead><tr><th scope="col">generation ${view.generation}, ${got.replicates === 1 ? 'one replicate' : `${got.replicates} replicates`}</th><th scope="col" class="right">${a}</th>${
          alone
            ? nothing
            : html`<th scope="col" class="right">${b}</th><th scope="col" class="right">${b} − ${a}</th><th scope="col" class="right">95 % interval</th><th scope="col"><span class="hidden-text">interval drawn</span></th>`
        }</tr></thead>
        <tbody>
          ${got.rows.map(
            (r) => html`<tr class=${r.indicator === chosen ? 'chosen' : ''}>
              <td><button class="plain row-button" aria-pressed=${r.indicator === chosen} @click=${() => {
                chosen = r.indicator;
                app.render();
              }}>${inWords(r.indicator)}</button></td>
              <td class="right">${short(r.left)}</td>
              ${
                alone
                  ? nothing
                  : html`<td class="right">${short(r.right)}</td><td class="right">${signed(r.difference)}</td>
                      <td class="right">${Number.isFinite(r.low) ? `${signed(r.low)} to ${signed(r.high)}` : '–'}</td>
                      <td>${interval(r)}</td>`
              }
            </tr>`,
          )}
        </tbody>
      </table>
    </div>
    ${
      series === undefined
        ? nothing
        : shown(
            app,
            `indicator-${chosen}`,
            `${inWords(chosen)} by generation`,
            linesFigure({ width: size.width, height: size.height - 22 }, series, {
              title: `${inWords(chosen)} by generation`,
              described: `Mean over ${info.replicates} replicates of ${inWords(chosen)} in ${a} and ${b}; band: one standard deviation of the replicates.`,
              xSays: 'generation',
              ySays: inWords(chosen),
              xNames: (v) => String(v),
              yNames: (v) => short(v),
              now: view.generation,
              xTicks: Array.from({ length: info.generations + 1 }, (_, t) => t),
            }),
          )
    }
  </div>`;
}

function signed(v: number): string {
  return Number.isFinite(v) ? (v > 0 ? `+${short(v)}` : v < 0 ? `−${short(-v)}` : '0') : '–';
}
