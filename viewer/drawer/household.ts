/**
 * The Household panel: line of descent, the decision now, whom the household sees, and what if it saw others.
 */
import { html, nothing, type TemplateResult } from 'lit-html';
import { decisionFigure } from '../../sim/results/figures/decision.js';
import { type Descent, descentFigure } from '../../sim/results/figures/descent.js';
import { referenceFigure } from '../../sim/results/figures/reference.js';
import { CAUSE } from '../data/source.js';
import type { App } from '../screen/app.js';
import { amount } from '../screen/words.js';
import { anatomy, decide, mixInWords, type Problem, wealthThatWouldDo } from './anatomy.js';
import { Fresh } from './fresh.js';
import { shown, units } from './show.js';

const descent = new Fresh<Omit<Descent, 'now'>>();

async function lineOf(app: App, arm: number, index: number): Promise<Omit<Descent, 'now'>> {
  const { generations } = app.source.info;
  const { replicate } = app.view;
  const wealth = new Float64Array(generations + 1).fill(NaN);
  const aspiration = new Float64Array(generations).fill(NaN);
  const met = new Uint8Array(generations);
  // one after another: a generation is a read, and the fields may be waiting for theirs
  for (let t = 0; t <= generations; t++) {
    if (t < generations && t % app.source.info.every !== 0) continue;
    const s = await app.loader.snapshot(arm, replicate, t);
    wealth[t] = s.wealth[index];
    if (t < generations) {
      aspiration[t] = s.aspirations[0][index];
      met[t] = s.met[index];
    }
  }
  return { wealth, aspiration, met };
}

export function householdPanel(app: App): TemplateResult {
  const { scene, view } = app;
  if (scene === null) return html``;
  if (scene.selected < 0) {
    return html`<div class="panel-empty">
      <p>Click a household in a field, or type its number above, to see its line of descent, the decision it faces now
        and whom it looks at.</p>
      <p class="note">The same household stands in both fields, with the same start and the same luck: what differs is whom it sees.</p>
    </div>`;
  }
  const i = scene.selected;
  const side = app.source.info.arms.length > 1 ? app.side : 0;
  const arm = scene.arms[side];
  const armIndex = side === 0 ? view.left : view.right;
  const model = app.source.info.arms[armIndex].model;
  const name = arm.name;
  const line = descent.get(
    `${app.sourceCount}/${armIndex}/${view.replicate}/${i}`,
    () => lineOf(app, armIndex, i),
    () => app.render(),
  );
  const second = units(app, 0.31, 20);
  const third = units(app, 0.38, 20);
  const first = units(app, 0.31, 16);
  const height = first.height - 22;
  const descentPart =
    line === undefined
      ? html`<p class="note">${descent.failed ?? 'Reading its line of descent …'}</p>`
      : shown(
          app,
          `household-${view.household}-descent`,
          descentHeading(app, i, name, first.width),
          descentFigure({ width: first.width, height }, { ...line, now: view.generation }),
        );
  if (!arm.now.decided) {
    return html`<div class="household"><div>${descentPart}</div>
      <div class="panel-empty"><p>These are the last children: they have not decided yet. Go back a generation to see the decision that made them.</p></div></div>`;
  }
  const aspirations = arm.now.aspirations.map((a) => a[i]);
  const problem: Problem = {
    model,
    group: arm.cast.group[i],
    wealth: arm.now.wealth[i],
    aspirations,
    childWeight: arm.cast.childWeight[i],
  };
  const decision = anatomy(problem);
  const neighbours: number[] = [];
  for (let e = arm.ties.start[i]; e < arm.ties.start[i + 1]; e++) neighbours.push(arm.now.wealth[arm.ties.target[e]]);
  const society = mean(arm.now.wealth);
  const usesSociety = model.milestones.some((m) => m.mix.some((p) => p.from === 'society' && p.weight > 0));
  const frustrated = arm.now.met[i] === 0;
  const heading = `Whom it sees: ${model.milestones.map((_, m) => mixInWords(model, m)).join('; then ')}`;
  return html`<div class="household">
    <div>${descentPart}</div>
    <div>${shown(
      app,
      `household-${view.household}-decision`,
      'The decision: lifetime utility',
      decisionFigure({ width: second.width, height }, decision),
    )}</div>
    <div class="sees">
      ${shown(
        app,
        `household-${view.household}-reference`,
        heading.length * 6.5 < third.width - 30 ? heading : 'Whom it sees',
        referenceFigure(
          { width: third.width, height: 66 },
          { own: arm.now.wealth[i], neighbours, aspirations, frustrated, society: usesSociety ? society : NaN },
        ),
      )}
      ${arm.now.isolated[i] === 1 ? html`<p class="note">It has no ties: its own wealth stands in.</p>` : nothing}
      ${whatIf(app, problem, society)}
    </div>
  </div>`;
}

/** The same decision with the society-wide reference, and with the reference of the other arm. */
function whatIf(app: App, problem: Problem, society: number): TemplateResult {
  const { scene } = app;
  if (scene === null) return html``;
  const i = scene.selected;
  const side = app.source.info.arms.length > 1 ? app.side : 0;
  const arm = scene.arms[side];
  const other = scene.arms[side === 0 ? 1 : 0];
  const { model } = problem;
  const phi = arm.earlier === null ? 0 : model.persistence;
  const wide = model.milestones.map(
    (m, k) => phi * (arm.earlier?.aspirations[k]?.[i] ?? 0) + (1 - phi) * m.scale * society,
  );
  const now = decide(problem);
  const asAll = decide({ ...problem, aspirations: wide });
  const does = (met: number): string => (met > 0 ? 'within reach' : 'out of reach');
  const cause =
    now.met === 0 && asAll.met > 0
      ? 'local cause'
      : now.met === 0
        ? 'general cause'
        : asAll.met === 0
          ? 'it is sheltered'
          : asAll.planned > now.planned
            ? 'it would plan more'
            : 'it would plan no more';
  const elsewhere =
    app.source.info.arms.length > 1 && other.now.decided ? other.now.aspirations.map((a) => a[i]) : null;
  const fits = elsewhere !== null && elsewhere.length === problem.aspirations.length;
  const asThere = fits ? decide({ ...problem, aspirations: elsewhere }) : null;
  const enough = wealthThatWouldDo(problem);
  const row = (asks: string, aspiration: number, met: number, so: string): TemplateResult => html`<li>
    <b>${asks}</b> aspiration ${amount(aspiration)}, ${does(met)}${so === '' ? nothing : html`; ${so}`}
  </li>`;
  const recorded = arm.now.cause[i];
  const differs =
    (recorded === CAUSE.local && asAll.met === 0) || (recorded === CAUSE.general && asAll.met > 0)
      ? ' (the results say otherwise)'
      : '';
  return html`<div class="what-if">
    <h3 class="hidden-text">What if</h3>
    <ul>
      ${row('Seeing all:', wide[0], asAll.met, `${cause}${differs}`)}
      ${asThere === null || elsewhere === null ? nothing : row(`As in ${other.name}:`, elsewhere[0], asThere.met, '')}
      ${
        Number.isFinite(enough)
          ? html`<li><b>If richer:</b> with ${amount(enough)} instead of ${amount(problem.wealth)} it would reach for it</li>`
          : nothing
      }
    </ul>
  </div>`;
}

/** Heading with the household's id, group and place, as many of them as fit. */
function descentHeading(app: App, i: number, arm: string, width: number): string {
  const cast = app.scene?.arms[0].cast;
  const said: string[] = [];
  if (cast !== undefined) {
    if (cast.names !== null) said.push(cast.names[i]);
    if (cast.groups > 1) said.push(app.source.info.groupNames[cast.group[i]]);
    if (cast.places > 1) said.push(cast.placeNames?.[cast.place[i]] ?? `place ${cast.place[i]}`);
  }
  for (let k = said.length; k > 0; k--) {
    const heading = `Line of descent in ${arm} (${said.slice(0, k).join(', ')})`;
    if (heading.length * 6.6 < width - 40) return heading;
  }
  return `Line of descent in ${arm}`;
}

function mean(values: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < values.length; i++) sum += values[i];
  return sum / values.length;
}
