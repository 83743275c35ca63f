/**
 * The generation strip: a pair of bars a generation, the frustrated share of each arm at its foot; click, drag or
 * arrow keys choose a generation, space plays.
 *
 * It is one slider to a screen reader. Knows shares, not households.
 */
import { html, nothing, svg, type TemplateResult } from 'lit-html';
import { percent } from '../screen/words.js';

export interface StripData {
  /** Frustrated share by generation, 0 … generations, in the left and the right field; NaN where undecided, null when one arm stands alone. */
  readonly shares: readonly [Float64Array, Float64Array | null];
  readonly names: readonly [string, string];
  readonly generation: number;
  /** Last generation that can be shown. */
  readonly reached: number;
  /** Generations 0, every, 2 every … can be shown. */
  readonly every: number;
  readonly playing: boolean;
}

export interface StripEvents {
  go(generation: number): void;
  play(): void;
}

const HIGH = 40;
const SLOT = 100;

export function strip(data: StripData, events: StripEvents): TemplateResult {
  const count = data.shares[0].length;
  const last = Math.max(0, data.reached);
  const toward = (e: PointerEvent): void => {
    const box = (e.currentTarget as Element).getBoundingClientRect();
    const t = Math.floor(((e.clientX - box.left) / box.width) * count);
    events.go(Math.max(0, Math.min(last, t)));
  };
  const says = (t: number): string => {
    const a = data.shares[0][t];
    const b = data.shares[1]?.[t];
    return Number.isNaN(a)
      ? `generation ${t}, the last children`
      : `generation ${t}: ${percent(a)} frustrated in ${data.names[0]}${b === undefined ? '' : `, ${percent(b)} in ${data.names[1]}`}`;
  };
  const key = (e: KeyboardEvent): void => {
    const to: Record<string, number> = {
      ArrowRight: data.generation + data.every,
      ArrowUp: data.generation + data.every,
      ArrowLeft: data.generation - data.every,
      ArrowDown: data.generation - data.every,
      Home: 0,
      End: last,
      PageUp: data.generation + 3 * data.every,
      PageDown: data.generation - 3 * data.every,
    };
    if (!(e.key in to)) return;
    e.preventDefault();
    events.go(Math.max(0, Math.min(last, to[e.key])));
  };
  return html`
    <div class="strip-lead">
      <span class="strip-title">frustrated, by generation</span>
      <button class="play" @click=${() => events.play()} aria-keyshortcuts="Space">
        <svg viewBox="0 0 12 12" aria-hidden="true">${
          data.playing ? svg`<path d="M2 1h3v10H2zM7 1h3v10H7z"></path>` : svg`<path d="M2 0.5v11l9-5.5z"></path>`
        }</svg>
        ${data.playing ? 'pause' : 'play'} <kbd>space</kbd>
      </button>
    </div>
    <div
      class="strip-bars"
      role="slider"
      tabindex="0"
      aria-label="Generation"
      aria-valuemin="0"
      aria-valuemax=${last}
      aria-valuenow=${data.generation}
      aria-valuetext=${says(data.generation)}
      @keydown=${key}
      @pointerdown=${(e: PointerEvent) => {
        (e.currentTarget as Element).setPointerCapture(e.pointerId);
        toward(e);
      }}
      @pointermove=${(e: PointerEvent) => {
        if (e.buttons === 1) toward(e);
      }}
    >
      <div class="strip-names" aria-hidden="true">
        ${Array.from(
          { length: count },
          (_, t) => html`<span class=${t === data.generation ? 'now' : t > data.reached ? 'ahead' : ''}
            >${t === count - 1 && count < 14 ? `${t}\u00a0children` : t}</span
          >`,
        )}
      </div>
      <svg viewBox=${`0 0 ${count * SLOT} ${HIGH}`} preserveAspectRatio="none" aria-hidden="true">
        ${Array.from({ length: count }, (_, t) => {
          const x = t * SLOT;
          const bar = (share: number, k: number): unknown => {
            const wide = data.shares[1] === null ? 44 : 29;
            const at = x + (data.shares[1] === null ? 28 : k === 0 ? 18.5 : 52.5);
            const known = Number.isFinite(share) && t <= data.reached;
            const high = known ? share * HIGH : 0;
            return svg`<rect class=${known ? 'strip-satisfied' : 'strip-open'} x=${at} y="0" width=${wide} height=${HIGH}></rect>
              <rect class=${k === 0 ? 'strip-frustrated' : 'strip-frustrated second'} x=${at} y=${HIGH - high} width=${wide} height=${high}></rect>`;
          };
          return svg`<g class=${t === data.generation ? 'now' : ''}>
            ${bar(data.shares[0][t], 0)}${data.shares[1] === null ? nothing : bar(data.shares[1][t], 1)}</g>`;
        })}
      </svg>
    </div>
  `;
}
