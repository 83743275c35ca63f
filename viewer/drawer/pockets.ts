/**
 * The Pockets panel: every pocket of both arms at the generation shown, to sort and to frame, and their life lines.
 */
import { html, type TemplateResult } from 'lit-html';
import { lifelinesFigure, type PocketMoment } from '../../sim/results/figures/lifelines.js';
import { numbers, type Table, text } from '../data/source.js';
import type { App } from '../screen/app.js';
import { amount, percent, pValue } from '../screen/words.js';
import { Fresh } from './fresh.js';
import { shown, units } from './show.js';

/** A pocket more than chance at this level is tinted in the field. */
export const LEVEL = 0.05;

export interface PocketRow {
  readonly arm: string;
  readonly generation: number;
  readonly pocket: number;
  readonly size: number;
  readonly fringe: number;
  readonly places: number;
  readonly meanWealth: number;
  readonly p: number;
  readonly event: string;
  readonly parent: number;
  readonly local: number;
  readonly general: number;
  /** Generations it has stood, this one included. */
  readonly age: number;
}

/** All pockets of a replicate, with their age along the life line. */
export function pocketRows(table: Table, replicate: number): PocketRow[] {
  const arm = text(table, 'arm');
  const rep = numbers(table, 'replicate');
  const column = (name: string): Float64Array => numbers(table, name);
  const [generation, pocket, size, fringe, places, wealth, p, parent, local, general] = [
    'generation',
    'pocket',
    'size',
    'fringe',
    'places',
    'mean_wealth',
    'p_value',
    'parent',
    'local',
    'general',
  ].map(column);
  const event = text(table, 'event');
  const born = new Map<string, number>();
  const rows: PocketRow[] = [];
  for (let k = 0; k < table.rows; k++) {
    if (rep[k] !== replicate || !(size[k] > 0)) continue;
    const key = `${arm[k]}/${pocket[k]}`;
    born.set(key, Math.min(born.get(key) ?? Infinity, generation[k]));
    rows.push({
      arm: arm[k],
      generation: generation[k],
      pocket: pocket[k],
      size: size[k],
      fringe: fringe[k],
      places: places[k],
      meanWealth: wealth[k],
      p: p[k],
      event: event[k],
      parent: Number.isNaN(parent[k]) ? -1 : parent[k],
      local: local[k],
      general: general[k],
      age: 0,
    });
  }
  return rows.map((r) => ({ ...r, age: r.generation - (born.get(`${r.arm}/${r.pocket}`) ?? r.generation) + 1 }));
}

const rowsOf = new Fresh<PocketRow[]>();
type Key = 'arm' | 'size' | 'age' | 'places' | 'meanWealth' | 'p' | 'local';
let sorted: { key: Key; down: boolean } = { key: 'size', down: true };

export function pocketsPanel(app: App): TemplateResult {
  const { scene, view } = app;
  const rows = rowsOf.get(
    `${app.sourceCount}/${view.replicate}`,
    async () => {
      const table = await app.source.table('pockets');
      return table === null ? [] : pocketRows(table, view.replicate);
    },
    () => app.render(),
  );
  if (scene === null || rows === undefined)
    return html`<p class="note">${rowsOf.failed ?? 'Reading the pockets …'}</p>`;
  const all = app.source.info.arms;
  const names = all.length === 1 ? [all[0].name] : [scene.arms[0].name, scene.arms[1].name];
  const here = rows
    .filter((r) => r.generation === view.generation && names.includes(r.arm))
    .sort((a, b) => {
      const [x, y] = [a[sorted.key], b[sorted.key]];
      const by =
        typeof x === 'string'
          ? x.localeCompare(String(y))
          : (Number.isNaN(x) ? 2 : x) - (Number.isNaN(y as number) ? 2 : (y as number));
      return (sorted.down ? -by : by) || b.size - a.size;
    });
  const head = (key: Key, says: string, right = true): TemplateResult => html`<th
    scope="col"
    class=${right ? 'right' : ''}
    aria-sort=${sorted.key === key ? (sorted.down ? 'descending' : 'ascending') : 'none'}
  ><button class="plain" @click=${() => {
    sorted = { key, down: sorted.key === key ? !sorted.down : key !== 'arm' && key !== 'p' };
    app.render();
  }}>${says}${sorted.key === key ? (sorted.down ? ' ↓' : ' ↑') : ''}</button></th>`;
  const frame = (r: PocketRow): void => app.framePocket(names.indexOf(r.arm) === 0 ? 0 : 1, r.pocket);
  const lines = names.map((name) =>
    rows
      .filter((r) => r.arm === name)
      .map(
        (r): PocketMoment => ({
          pocket: r.pocket,
          generation: r.generation,
          size: r.size,
          pValue: r.p,
          parent: r.parent,
        }),
      ),
  );
  const chosen = (r: PocketRow): boolean =>
    view.pocket !== null && names[view.pocket.field] === r.arm && view.pocket.id === r.pocket;
  const size = units(app, 0.24, 14);
  return html`<div class="pockets">
    <div class="scrolls">
      ${
        here.length === 0
          ? html`<div class="panel-empty"><p>No pocket in generation ${view.generation}: nowhere do enough neighbouring households stay frustrated together.</p>
              <p class="note">A pocket is a group of neighbours, each frustrated for at least two generations and with at least half of its ties frustrated.</p></div>`
          : html`<table class="list">
        <thead><tr>
          ${head('arm', 'arm', false)}${head('size', 'core')}<th scope="col" class="right">fringe</th>${head('age', 'age')}${head('places', 'places')}${head('meanWealth', 'mean wealth')}${head('p', 'p')}${head('local', 'cause')}<th scope="col">now</th>
        </tr></thead>
        <tbody>
          ${here.map((r) => {
            const share = r.local / Math.max(1, r.local + r.general);
            return html`<tr class=${`${r.p < LEVEL ? '' : 'chance'}${chosen(r) ? ' chosen' : ''}`}>
              <td><button class="plain row-button" @click=${() => frame(r)}>${r.arm} · ${r.pocket}</button></td>
              <td class="right">${r.size}</td><td class="right">${r.fringe}</td><td class="right">${r.age}</td><td class="right">${r.places}</td>
              <td class="right">${amount(r.meanWealth)}</td>
              <td class="right">${pValue(r.p)}</td>
              <td class="right">${Number.isFinite(share) && r.local + r.general > 0 ? `${percent(share)} local` : '–'}</td>
              <td>${r.p < LEVEL ? r.event : `${r.event}${r.event === '' ? '' : '; '}not more than chance`}</td>
            </tr>`;
          })}
        </tbody>
      </table>`
      }
    </div>
    ${lines.map((moments, k) =>
      shown(
        app,
        `pockets-${names[k].replaceAll(' ', '-')}`,
        `Life lines in ${names[k]}`,
        lifelinesFigure({ width: size.width, height: size.height - 22 }, moments, {
          title: `Life lines of pockets in ${names[k]}`,
          generations: app.source.info.generations,
          now: view.generation,
        }),
      ),
    )}
  </div>`;
}
