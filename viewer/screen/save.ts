/**
 * The Save sheet: what can be kept of the study shown, each with a line on what it is.
 */
import { html, nothing, type TemplateResult } from 'lit-html';

export interface SaveOffer {
  readonly name: string;
  readonly says: string;
  act(): Promise<void>;
}

export interface SaveState {
  readonly offers: readonly SaveOffer[];
  readonly link: string | null;
  /** What is being made, or ''. */
  readonly doing: string;
  /** Why the last one could not be made, or ''. */
  readonly trouble: string;
  /** What holds for all of them, or null. */
  readonly note: string | null;
}

export function saveSheet(state: SaveState, close: () => void, copy: () => void): TemplateResult {
  return html`
    <div class="dialog-head"><h2>Save</h2><button class="plain" @click=${close}>close</button></div>
    <ul class="offers">
      ${state.offers.map(
        (offer) => html`<li><button class="offer" ?disabled=${state.doing !== ''} @click=${() => offer.act()}>
          <b>${offer.name}</b><span>${offer.says}</span></button></li>`,
      )}
    </ul>
    ${
      state.link === null
        ? nothing
        : html`<p class="link-line"><label>Link to this view <input readonly .value=${state.link} @focus=${(e: Event) => (e.target as HTMLInputElement).select()} /></label>
            <button class="button" @click=${copy}>Copy</button></p>`
    }
    ${state.note === null ? nothing : html`<p class="note">${state.note}</p>`}
    <p class=${state.trouble === '' ? 'note' : 'message wrong'} role="status">${
      state.trouble !== ''
        ? state.trouble
        : state.doing !== ''
          ? state.doing
          : 'Any figure of the drawer is saved by the svg beside its name.'
    }</p>
  `;
}
