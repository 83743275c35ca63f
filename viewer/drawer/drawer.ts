/**
 * The drawer: tabs and the panel of the one chosen.
 */
import { html, nothing, type TemplateResult } from 'lit-html';
import type { App } from '../screen/app.js';
import { TABS, type Tab } from '../screen/view.js';
import { contrastsPanel } from './contrasts.js';
import { distributionPanel } from './distribution.js';
import { estimatesPanel } from './estimates.js';
import { householdPanel } from './household.js';
import { pocketsPanel } from './pockets.js';

export function drawer(app: App): TemplateResult {
  const { view, scene } = app;
  const pockets = scene === null ? 0 : scene.arms[0].pockets.length + scene.arms[1].pockets.length;
  const name = (tab: Tab): string => {
    if (tab === 'household' && view.household !== null) return `Household ${view.household}`;
    if (tab === 'pockets' && pockets > 0) return `Pockets ${pockets}`;
    return tab[0].toUpperCase() + tab.slice(1);
  };
  const key = (e: KeyboardEvent): void => {
    const at = TABS.indexOf(view.tab);
    const to: Record<string, number> = { ArrowRight: at + 1, ArrowLeft: at - 1, Home: 0, End: TABS.length - 1 };
    if (!(e.key in to)) return;
    e.preventDefault();
    const tab = TABS[(to[e.key] + TABS.length) % TABS.length];
    void app.change({ tab });
    (app.mount.querySelector(`#tab-${tab}`) as HTMLElement | null)?.focus();
  };
  const panels: Record<Tab, (app: App) => TemplateResult> = {
    household: householdPanel,
    pockets: pocketsPanel,
    distribution: distributionPanel,
    contrasts: contrastsPanel,
    estimates: estimatesPanel,
  };
  return html`
    <div class="tab-row">
      <div class="tabs" role="tablist" aria-label="Details" @keydown=${key}>
        ${TABS.map(
          (tab) => html`<button
            class="tab"
            role="tab"
            id=${`tab-${tab}`}
            aria-selected=${tab === view.tab}
            aria-controls="panel"
            tabindex=${tab === view.tab ? 0 : -1}
            @click=${() => app.change({ tab })}
          >${name(tab)}</button>`,
        )}
      </div>
      ${
        view.tab === 'household' && scene !== null && scene.selected >= 0 && app.source.info.arms.length > 1
          ? html`<span class="choice" role="radiogroup" aria-label="Arm of the household shown"><span class="says">in</span>${scene.arms.map(
              (arm, k) =>
                html`<button class="plain" role="radio" aria-checked=${app.side === k} @click=${() => app.lookAt(k === 0 ? 0 : 1)}>${arm.name}</button>`,
            )}</span>`
          : nothing
      }
    </div>
    <div class="panel" id="panel" role="tabpanel" aria-labelledby=${`tab-${view.tab}`} tabindex="0">${panels[view.tab](
      app,
    )}</div>
  `;
}
