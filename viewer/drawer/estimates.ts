/**
 * The Estimates panel: the regressions of the study's plan, as a coefficient plot and a table.
 */
import { html, type TemplateResult } from 'lit-html';
import { short } from '../../sim/results/figures/figure.js';
import { type Interval, intervalsFigure, intervalsHeight } from '../../sim/results/figures/intervals.js';
import { numbers, type Table, text } from '../data/source.js';
import type { App } from '../screen/app.js';
import { pValue } from '../screen/words.js';
import { Fresh } from './fresh.js';
import { shown, units } from './show.js';

const table = new Fresh<Table | null>();
let chosen = '';

export function estimatesPanel(app: App): TemplateResult {
  const got = table.get(
    String(app.sourceCount),
    () => app.source.table('estimates'),
    () => app.render(),
  );
  if (got === undefined || got === null) {
    return html`<div class="panel-empty">
      <p>${table.failed ?? (got === null ? 'This study has no regressions.' : 'Reading the estimates …')}</p>
      ${got === null ? html`<p class="note">Add <code>estimates:</code> to the study, or run a plan on the results: <code>rungsight estimate DIR --plan PLAN.yaml</code></p>` : ''}
    </div>`;
  }
  const name = text(got, got.columns.name === undefined ? 'estimate_name' : 'name');
  const arm = text(got, 'arm');
  const term = text(got, 'term');
  const [estimate, error, low, high, p] = ['estimate', 'std_error', 'ci_low', 'ci_high', 'p_value'].map((c) =>
    numbers(got, c),
  );
  const names = [...new Set(name)];
  if (!names.includes(chosen)) chosen = names[0] ?? '';
  const arms = [...new Set(arm)];
  const rows: number[] = [];
  for (let k = 0; k < got.rows; k++) if (name[k] === chosen) rows.push(k);
  const intervals = rows.map(
    (k): Interval => ({
      name: arms.length > 1 ? `${term[k]}, ${arm[k]}` : term[k],
      estimate: estimate[k],
      low: low[k],
      high: high[k],
      series: arms.indexOf(arm[k]),
    }),
  );
  const size = units(app, 0.45, 20);
  return html`<div class="contrasts">
    <div class="scrolls">
      <label class="choice"><span class="says">estimate</span>
        <select class="quiet" @change=${(e: Event) => {
          chosen = (e.target as HTMLSelectElement).value;
          app.render();
        }}>${names.map((n) => html`<option ?selected=${n === chosen}>${n}</option>`)}</select></label>
      <table class="list"><thead><tr><th scope="col">term</th><th scope="col">arm</th><th scope="col" class="right">coefficient</th><th scope="col" class="right">error</th><th scope="col" class="right">95 % interval</th><th scope="col" class="right">p</th></tr></thead>
      <tbody>${rows.map((k) => html`<tr><td>${term[k]}</td><td>${arm[k]}</td><td class="right">${short(estimate[k])}</td><td class="right">${short(error[k])}</td><td class="right">${short(low[k])} to ${short(high[k])}</td><td class="right">${pValue(p[k])}</td></tr>`)}</tbody></table>
    </div>
    <div class="scrolls">${shown(
      app,
      'coefficients',
      chosen,
      intervalsFigure(
        { width: size.width, height: Math.max(size.height - 22, intervalsHeight(intervals.length)) },
        intervals,
        {
          title: `Coefficients of ${chosen}`,
          described: `${intervals.length} coefficients with 95 % intervals; filled where the interval leaves zero out.`,
          xSays: 'coefficient, 95 % interval',
        },
      ),
    )}</div>
  </div>`;
}
