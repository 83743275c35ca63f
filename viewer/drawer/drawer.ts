/**
 * The drawer: tabs and the panel of the one chosen.
 */
import { html, type TemplateResult } from 'lit-html';
import type { App } from '../screen/app.js';
import { TABS, type Tab } from '../screen/view.js';

export function drawer(app: App): TemplateResult {
  const { view } = app;
  const name = (tab: Tab): string => {
    const word = tab[0].toUpperCase() + tab.slice(1);
    if (tab === 'household' && view.household !== null) return `Household ${view.household}`;
    return word;
  };
  const key = (e: KeyboardEvent): void => {
    const at = TABS.indexOf(view.tab);
    const to = e.key === 'ArrowRight' ? at + 1 : e.key === 'ArrowLeft' ? at - 1 : -9;
    if (to < -1) return;
    e.preventDefault();
    const tab = TABS[(to + TABS.length) % TABS.length];
    void app.change({ tab });
    (app.mount.querySelector(`#tab-${tab}`) as HTMLElement | null)?.focus();
  };
  return html`
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
    <div class="panel" id="panel" role="tabpanel" aria-labelledby=${`tab-${view.tab}`} tabindex="0"></div>
  `;
}
