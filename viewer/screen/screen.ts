/**
 * The one screen: header, legend, two fields with the pyramid between them, the strip and the drawer.
 *
 * Templates only; what they show and do comes from the app.
 */
import { html, nothing, svg, type TemplateResult } from 'lit-html';
import type { Arrangement } from '../field/arrangement.js';
import { COLOURINGS, type Colouring, type LegendItem } from '../field/colouring.js';
import { stageTemplate } from '../field/stage.js';
import type { View } from './view.js';

export interface ScreenParts {
  readonly view: View;
  readonly title: string;
  readonly replicates: readonly number[];
  readonly replicateCount: number;
  readonly report: string | null;
  readonly armNames: readonly string[];
  /** Names over the two fields. */
  readonly heads: readonly [string, string];
  readonly notes: readonly [string, string];
  readonly feet: readonly [string, string];
  readonly summary: string;
  readonly legend: readonly LegendItem[];
  readonly colourings: readonly Colouring[];
  readonly running: { readonly share: number; readonly doing: string } | null;
  readonly message: { readonly says: string; readonly wrong: boolean } | null;
  readonly strip: TemplateResult;
  readonly drawer: TemplateResult;
  readonly overlay: unknown;
  readonly dark: boolean;
}

export interface ScreenEvents {
  change(patch: Partial<View>): void;
  study(): void;
  run(): void;
  cancel(): void;
  save(): void;
  find(text: string): void;
  theme(): void;
  guide(): void;
  dismiss(): void;
  stageKey(e: KeyboardEvent): void;
}

function mark(item: LegendItem): TemplateResult {
  switch (item.kind) {
    case 'disc':
      return html`<svg viewBox="0 0 16 16" aria-hidden="true">${svg`<circle cx="8" cy="8" r="5" fill=${item.colour}></circle>`}</svg>`;
    case 'ring':
      return html`<svg viewBox="0 0 16 16" aria-hidden="true">${svg`<circle cx="8" cy="8" r="5.6" fill="none" stroke=${item.colour} stroke-width="2.8"></circle>`}</svg>`;
    case 'tint':
      return html`<svg viewBox="0 0 16 16" aria-hidden="true">${svg`<rect x="-1" y="1" width="18" height="14" rx="6" fill=${item.colour} fill-opacity="0.24"></rect>`}</svg>`;
    case 'ramp':
      return html`<svg class="wide" viewBox="0 0 90 16" preserveAspectRatio="none" aria-hidden="true">
        ${svg`<defs><linearGradient id="ramp">${item.colours.map((c, k) => svg`<stop offset=${k / (item.colours.length - 1)} stop-color=${c}></stop>`)}</linearGradient></defs>
        <rect x="0" y="3" width="90" height="10" rx="5" fill="url(#ramp)"></rect>`}</svg>`;
  }
}

export function legendTemplate(items: readonly LegendItem[]): TemplateResult {
  return html`<div class="legend" aria-label="Legend" role="group">
    ${items.map((item) =>
      item.kind === 'ramp'
        ? html`<span class="legend-item"><span>${item.from}</span>${mark(item)}<span>${item.to}</span></span>`
        : html`<span class="legend-item">${mark(item)}${item.says}</span>`,
    )}
  </div>`;
}

function armName(parts: ScreenParts, events: ScreenEvents, side: 'left' | 'right'): unknown {
  const arm = parts.view[side];
  if (parts.armNames.length < 3) return html`<h2 class="arm-name">${parts.heads[side === 'left' ? 0 : 1]}</h2>`;
  return html`<h2 class="arm-name"><select
    class="quiet"
    aria-label=${`Arm in the ${side} field`}
    @change=${(e: Event) => events.change({ [side]: Number((e.target as HTMLSelectElement).value) })}
  >${parts.armNames.map((name, k) => html`<option value=${k} ?selected=${k === arm}>${name}</option>`)}</select></h2>`;
}

export function screenTemplate(parts: ScreenParts, events: ScreenEvents): TemplateResult {
  const { view } = parts;
  const arrange = (to: Arrangement): TemplateResult => html`<button
    class="plain"
    role="radio"
    aria-checked=${view.arrangement === to}
    @click=${() => events.change({ arrangement: to })}
  >${to}</button>`;
  return html`<div class="screen">
    <header class="header">
      <div class="heading">
        <div class="title">
          <h1>${parts.title}</h1>
          ${
            parts.replicates.length > 1
              ? html`<label>replicate
                  <select class="quiet" @change=${(e: Event) => events.change({ replicate: Number((e.target as HTMLSelectElement).value) })}>
                    ${parts.replicates.map((r) => html`<option value=${r} ?selected=${r === view.replicate}>${r + 1}</option>`)}
                  </select>
                  of ${parts.replicateCount}</label>`
              : html`<span class="of">replicate ${view.replicate + 1} of ${parts.replicateCount}</span>`
          }
          ${parts.report === null ? nothing : html`<a class="report" href=${parts.report} target="_blank" rel="noopener">report</a>`}
        </div>
        <p class="summary" role="status" aria-live="polite">${parts.summary}</p>
        ${
          parts.message === null
            ? nothing
            : html`<p class=${parts.message.wrong ? 'message wrong' : 'message'} role="alert">${parts.message.says}
                <button class="plain" @click=${() => events.dismiss()}>dismiss</button></p>`
        }
      </div>
      <div class="actions">
        ${
          parts.running === null
            ? nothing
            : html`<span class="running"><progress max="1" .value=${parts.running.share} aria-label="Run"></progress>
                <span>${Math.round(parts.running.share * 100)}\u202f%, ${parts.running.doing}</span></span>`
        }
        <button class="button" @click=${() => events.study()}>Study…</button>
        ${
          parts.running === null
            ? html`<button class="button" @click=${() => events.run()}>Run</button>`
            : html`<button class="button" @click=${() => events.cancel()}>Cancel</button>`
        }
        <button class="button main" @click=${() => events.save()}>Save…</button>
      </div>
    </header>
    <div class="tools">
      ${legendTemplate(parts.legend)}
      <div class="choices">
        <span class="choice" role="radiogroup" aria-label="Arrangement">${arrange('ladder')}${arrange('map')}</span>
        <button class="plain" aria-pressed=${view.ties} @click=${() => events.change({ ties: !view.ties })}>ties</button>
        <label class="choice"><span class="says">colour by</span>
          <select class="quiet" @change=${(e: Event) => events.change({ colouring: (e.target as HTMLSelectElement).value as Colouring })}>
            ${COLOURINGS.filter((c) => parts.colourings.includes(c)).map((c) => html`<option value=${c} ?selected=${c === view.colouring}>${c}</option>`)}
          </select></label>
        <form class="choice find" @submit=${(e: SubmitEvent) => {
          e.preventDefault();
          events.find(((e.target as HTMLFormElement).elements[0] as HTMLInputElement).value);
        }}><label class="choice"><span class="says">household</span>
          <input inputmode="numeric" autocomplete="off" placeholder="number" .value=${view.household === null ? '' : String(view.household)} /></label></form>
        <button class="plain" @click=${() => events.theme()}>${parts.dark ? 'light' : 'dark'}</button>
        <button class="plain" @click=${() => events.guide()}>guide</button>
      </div>
    </div>
    <section class="stage" tabindex="0" role="group" aria-label="Fields: the same households in two arms. Plus and minus zoom, arrows shift, 0 shows all, comma and full stop step through households."
      @keydown=${(e: KeyboardEvent) => events.stageKey(e)}>
      ${stageTemplate(
        html`${armName(parts, events, 'left')}<span class="says">${parts.notes[0]}</span>`,
        html`${armName(parts, events, 'right')}<span class="says">${parts.notes[1]}</span>`,
        html`<span>${parts.feet[0]}</span>`,
        html`<span>${parts.feet[1]}</span>`,
      )}
    </section>
    <section class="strip" aria-label="Generations">${parts.strip}</section>
    <section class="drawer" aria-label="Details">${parts.drawer}</section>
    ${parts.overlay ?? nothing}
  </div>`;
}
