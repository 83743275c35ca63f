/**
 * A figure in the page: the same string the report has, with a way to save it.
 */
import { html, type TemplateResult } from 'lit-html';
import { unsafeHTML } from 'lit-html/directives/unsafe-html.js';
import type { App } from '../screen/app.js';

/** Width and height of a part of the drawer, in figure units (text 13 high). */
export function units(app: App, share: number, taken = 0): { width: number; height: number } {
  const { width, height } = app.panelSize;
  return { width: Math.max(150, width * share - taken), height: Math.max(110, height) };
}

/**
 * @param name - file name of the saved figure, without ending
 * @param heading - shown above the figure
 */
export function shown(app: App, name: string, heading: string, svg: string): TemplateResult {
  return html`<figure class="shown">
    <figcaption>
      <span>${heading}</span>
      <button class="plain save-figure" @click=${() => app.saveFigure(name, svg)} aria-label=${`Save the figure ${heading} as SVG`}>svg</button>
    </figcaption>
    ${unsafeHTML(svg)}
  </figure>`;
}
