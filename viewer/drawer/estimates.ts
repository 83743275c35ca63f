/**
 * The Estimates panel: the regressions of the study's plan, as a coefficient plot and a table.
 */
import { html, type TemplateResult } from 'lit-html';
import { type CoefficientStrip, coefficientsFigure } from '../../sim/results/figures/coefficients.js';
import { short as plain } from '../../sim/results/figures/figure.js';
import { type EstimatesFile, parseEstimates, termWords } from '../../sim/results/report/estimates.js';
import type { App } from '../screen/app.js';
import { percent } from '../screen/words.js';
import { Fresh } from './fresh.js';
import { shown, units } from './show.js';

const FILE = 'estimates.json';
const CONSTANT = '(const)';
const found = new Fresh<EstimatesFile | null>();
let chosen = '';

const short = (value: number): string => plain(value).replace(/^-/, '−');

async function load(app: App): Promise<EstimatesFile | null> {
  const files = await app.source.files();
  if (!files.includes(FILE)) return null;
  return parseEstimates(new TextDecoder().decode(await app.source.file(FILE)));
}

export function estimatesPanel(app: App): TemplateResult {
  const got = found.get(
    String(app.sourceCount),
    () => load(app),
    () => app.render(),
  );
  if (got === undefined) return html`<p class="note">${found.failed ?? 'Reading the estimates …'}</p>`;
  if (got === null) {
    return html`<div class="panel-empty">
      <p>This study has no regressions.</p>
      <p class="note">Write them under <code>estimates:</code> in the study, or run a plan on the results:
        <code>rungsight estimate DIR --plan PLAN.yaml</code></p>
    </div>`;
  }
  const names = [...new Set(got.summary.map((one) => one.name))];
  if (!names.includes(chosen)) chosen = names[0];
  const summaries = got.summary.filter((one) => one.name === chosen);
  const regressions = got.estimates.filter((one) => one.name === chosen);
  const replicates = Math.max(...summaries.map((one) => one.replicates));
  const arms = [...new Set(summaries.map((one) => one.arm ?? 'all arms'))];
  const terms = [...new Set(summaries.flatMap((one) => one.terms.map((term) => term.term)))].filter(
    (t) => t !== CONSTANT,
  );
  const strips = terms.map(
    (term): CoefficientStrip => ({
      term: termWords(term),
      rows: summaries.flatMap((one) => {
        const t = one.terms.find((each) => each.term === term);
        if (t === undefined) return [];
        const arm = one.arm ?? 'all arms';
        // over replicates: where 95 % of single replicates fall; for one replicate: its own interval
        const own = regressions.find((r) => r.arm === one.arm)?.terms.find((each) => each.term === term);
        const half = 1.96 * (t.sd ?? NaN);
        const [low, high] =
          t.replicates > 1 && t.sd !== null
            ? [t.mean - half, t.mean + half]
            : [own?.ci_low ?? NaN, own?.ci_high ?? NaN];
        return [{ arm, estimate: t.mean, low, high, truth: t.truth }];
      }),
    }),
  );
  const size = units(app, 0.42, 20);
  const known = summaries.some((one) => one.terms.some((t) => t.truth !== null));
  const method = { ols: 'least squares', logit: 'logit', iv: 'instruments' }[summaries[0].method];
  return html`<div class="contrasts">
    <div class="scrolls" tabindex="0" role="group" aria-label="Estimates">
      <p><label class="choice"><span class="says">regression</span>
        <select class="quiet" @change=${(e: Event) => {
          chosen = (e.target as HTMLSelectElement).value;
          app.render();
        }}>${names.map((n) => html`<option ?selected=${n === chosen}>${n}</option>`)}</select></label>
        <span class="note">${termWords(summaries[0].outcome)} by ${method},
          ${replicates === 1 ? 'one replicate' : `${replicates} replicates`},
          ${Math.round(summaries[0].mean_nobs)} rows</span></p>
      <table class="list"><thead><tr><th scope="col">term</th><th scope="col">arm</th><th scope="col" class="right">${replicates > 1 ? 'mean' : 'coefficient'}</th>
        <th scope="col" class="right">${replicates > 1 ? 'sd' : 'error'}</th><th scope="col" class="right">${replicates > 1 ? 'not 0 in' : 'p'}</th>
        ${known ? html`<th scope="col" class="right">truth</th>` : ''}</tr></thead>
      <tbody>${terms.flatMap((term) =>
        summaries.map((one) => {
          const t = one.terms.find((each) => each.term === term);
          if (t === undefined) return html``;
          const own = regressions.find((r) => r.arm === one.arm)?.terms.find((each) => each.term === term);
          return html`<tr><td>${termWords(term)}</td><td>${one.arm ?? 'all arms'}</td><td class="right">${short(t.mean)}</td>
            <td class="right">${short(replicates > 1 ? (t.sd ?? NaN) : (own?.std_error ?? NaN))}</td>
            <td class="right">${replicates > 1 ? percent(t.rejects_zero) : short(own?.p_value ?? NaN)}</td>
            ${known ? html`<td class="right">${t.truth === null ? '–' : short(t.truth)}</td>` : ''}</tr>`;
        }),
      )}</tbody></table>
      ${[...new Set(regressions.flatMap((r) => r.notes))].map((note) => html`<p class="note">${note}</p>`)}
    </div>
    <div class="scrolls" tabindex="0" role="group" aria-label="Coefficients">${shown(
      app,
      'coefficients',
      `Coefficients${known ? '; bar: the truth' : ''}`,
      coefficientsFigure(
        size.width,
        strips,
        arms,
        `Coefficients of ${chosen}`,
        strips.map((s) => `${s.term}: ${s.rows.map((r) => `${r.arm} ${short(r.estimate)}`).join(', ')}`).join('; '),
      ),
    )}</div>
  </div>`;
}
