/**
 * The walk-through and the cautions: a quiet card, a step at a time, dismissed for good when the reader says so.
 */
import { html, nothing, type TemplateResult } from 'lit-html';

/** A step: what it says, and the part of the screen it is about. */
interface Step {
  readonly about: 'fields' | 'pyramid' | 'strip' | 'drawer' | 'caution';
  readonly title: string;
  readonly says: string;
}

export const STEPS: readonly Step[] = [
  {
    about: 'caution',
    title: 'Before you look',
    says: 'A simulation explores mechanisms. It predicts no family’s future and is no basis for deciding about one. Survey files stay on this machine; leave names and identifiers out of them. Programmes that move people, money or ties need ethics review, consent and the law of the place.',
  },
  {
    about: 'fields',
    title: 'The same households, twice',
    says: 'Each mark is a household, in two networks. Height is wealth. A filled disc meets its aspiration; an open ring is frustrated: what it sees others have is out of its reach, and it invests less.',
  },
  {
    about: 'strip',
    title: 'Time',
    says: 'A pair of bars a generation: the share frustrated in the left and the right field. Click, drag, use the arrow keys, or press space to play.',
  },
  {
    about: 'pyramid',
    title: 'Two peaks, or one',
    says: 'Both wealth distributions back to back on the fields’ own axis. Poverty, take-off and a second peak show here first.',
  },
  {
    about: 'drawer',
    title: 'One household, one pocket',
    says: 'Click a household to see whom it looks up to, its decision taken apart, and what it would do if it saw everyone. A tinted pocket is a neighbourhood that stays frustrated together more than chance would have it.',
  },
];

export interface GuideEvents {
  step(to: number): void;
  close(forGood: boolean): void;
}

/** @param step - index of the step shown; `only` shows the caution alone */
export function guide(step: number, only: boolean, events: GuideEvents): TemplateResult {
  const shown = STEPS[step];
  return html`<aside class=${`guide at-${shown.about}`} role="dialog" aria-modal="false" aria-labelledby="guide-title" tabindex="-1">
    <h2 id="guide-title">${shown.title}</h2>
    <p>${shown.says}</p>
    <div class="guide-foot">
      ${
        only
          ? html`<span></span><button class="button main" @click=${() => events.close(false)}>Understood</button>`
          : html`<span class="note">${step + 1} of ${STEPS.length}</span>
            ${step > 0 ? html`<button class="plain" @click=${() => events.step(step - 1)}>back</button>` : nothing}
            <button class="plain" @click=${() => events.close(true)}>don’t show again</button>
            ${
              step + 1 < STEPS.length
                ? html`<button class="button main" @click=${() => events.step(step + 1)}>Next</button>`
                : html`<button class="button main" @click=${() => events.close(true)}>Done</button>`
            }`
      }
    </div>
  </aside>`;
}
