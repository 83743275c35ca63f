/**
 * What every figure is made of: an accessible SVG string in units where text is 13 high, and its style sheet.
 *
 * Figures are pure functions from data to text, the same in the page, in the report and in a saved file. They carry
 * class names and no style of their own: a page adds `figureStyle` once, a saved file gets it inside (`standalone`).
 */
import { DARK, LIGHT, type Palette } from './palette.js';

/** Size of a figure, in units where text is 13 high. */
export interface Size {
  readonly width: number;
  readonly height: number;
}

/** Text made safe between tags and in attributes. */
export function safe(text: string): string {
  return text.replace(/[&<>"']/g, (c) => `&#${c.charCodeAt(0)};`);
}

/** A coordinate, short. */
export function at(v: number): string {
  return Number.isFinite(v) ? String(Math.round(v * 100) / 100) : '0';
}

/**
 * The figure around its parts.
 *
 * @param title - its name, one line
 * @param described - what it shows, in a sentence or two, for those who do not see it
 * @param body - SVG elements
 */
export function figure(size: Size, title: string, described: string, body: string): string {
  return (
    `<svg xmlns="http://www.w3.org/2000/svg" class="figure" role="img" viewBox="0 0 ${at(size.width)} ${at(size.height)}">` +
    `<title>${safe(title)}</title><desc>${safe(described)}</desc>${body}</svg>`
  );
}

/** An estimate of the width of a text, in figure units. */
export function textWidth(text: string, size = 13): number {
  return text.length * 0.53 * size;
}

export type Anchor = 'start' | 'middle' | 'end';

export function label(x: number, y: number, text: string, anchor: Anchor = 'start', name = 'f-text'): string {
  return `<text class="${name}" x="${at(x)}" y="${at(y)}" text-anchor="${anchor}">${safe(text)}</text>`;
}

export function rule(x1: number, y1: number, x2: number, y2: number, name: string): string {
  return `<line class="${name}" x1="${at(x1)}" y1="${at(y1)}" x2="${at(x2)}" y2="${at(y2)}"/>`;
}

/** A label kept between two edges: moved, and turned to the other side where it would be cut. */
export function heldLabel(x: number, y: number, text: string, left: number, right: number, name = 'f-text'): string {
  const half = textWidth(text) / 2;
  return label(Math.max(left + half, Math.min(right - half, x)), y, text, 'middle', name);
}

/**
 * Heights for labels that want to stand at given heights without touching.
 *
 * @param wanted - heights wished for
 * @param distance - least distance between two
 * @returns heights in the order given
 */
export function spread(wanted: readonly number[], distance: number, low: number, high: number): number[] {
  const order = wanted.map((_, k) => k).sort((a, b) => wanted[a] - wanted[b]);
  const out = [...wanted];
  let last = low - distance;
  for (const k of order) {
    out[k] = Math.max(wanted[k], last + distance);
    last = out[k];
  }
  let next = high + distance;
  for (const k of order.reverse()) {
    out[k] = Math.min(out[k], next - distance);
    next = out[k];
  }
  return out;
}

/** Dash patterns by series: the arms are told apart without colour. */
export const DASHES = ['', '6 4', '2 3', '9 3 2 3', '4 2 1 2', '12 3'] as const;

/** A number for an axis or a label: two or three figures. */
export function short(value: number): string {
  if (!Number.isFinite(value)) return '–';
  const size = Math.abs(value);
  if (size === 0) return '0';
  if (size >= 1e6) return `${trim((value / 1e6).toPrecision(2))} million`;
  if (size >= 1000) return String(Math.round(value)).replace(/\B(?=(\d{3})+$)/g, '\u202f');
  if (size >= 100) return value.toFixed(0);
  if (size >= 10) return trim(value.toFixed(1));
  if (size >= 0.1) return trim(value.toFixed(2));
  if (size >= 1e-4) return trim(value.toFixed(size >= 0.01 ? 3 : size >= 0.001 ? 4 : 5));
  return value.toExponential(0);
}

function trim(text: string): string {
  return text.includes('.') ? text.replace(/0+$/, '').replace(/\.$/, '') : text;
}

/** A share as a percentage. */
export function percent(share: number): string {
  return Number.isFinite(share) ? `${Math.round(share * 100)}\u202f%` : '–';
}

function rules(c: Readonly<Record<string, string>>): string {
  return `
.figure{font-family:'Atkinson Hyperlegible Next',Verdana,sans-serif;font-size:13px;font-variant-numeric:tabular-nums;overflow:visible}
.figure text{fill:${c.ink}}
.figure .f-soft{fill:${c.soft}}
.figure .f-strong{font-weight:700}
.figure .f-head{font-weight:600}
.figure .f-frustrated-text{fill:${c.frustratedText};font-weight:600}
.figure .f-over{paint-order:stroke;stroke:${c.panel};stroke-width:4px;stroke-linejoin:round}
.figure .f-line{stroke:${c.ink};stroke-width:1.6;fill:none;stroke-linejoin:round}
.figure .f-thin{stroke:${c.soft};stroke-width:1.2;fill:none;stroke-linejoin:round}
.figure .f-dash{stroke:${c.ink};stroke-width:1.4;fill:none;stroke-dasharray:5 4}
.figure .f-dots{stroke:${c.soft};stroke-width:1.2;fill:none;stroke-dasharray:1 4;stroke-linecap:round}
.figure .f-grid{stroke:${c.faint};stroke-width:1;fill:none}
.figure .f-axis{stroke:${c.line};stroke-width:1;fill:none}
.figure .f-bar{stroke:${c.ink};stroke-width:2.6;fill:none}
.figure .f-bar-frustrated{stroke:${c.frustrated};stroke-width:2.6;fill:none}
.figure .f-satisfied{fill:${c.satisfied}}
.figure .f-quiet{fill:${c.quiet}}
.figure .f-ink{fill:${c.ink}}
.figure .f-panel{fill:${c.panel}}
.figure .f-ghost{fill:${c.faint}}
.figure .f-frustrated{fill:${c.frustrated}}
.figure .f-second{fill:${c.frustrated};fill-opacity:.55}
.figure .f-disc{fill:${c.satisfied}}
.figure .f-ring{fill:${c.panel};stroke:${c.frustrated};stroke-width:2.4}
.figure .f-open{fill:${c.panel};stroke:${c.ink};stroke-width:1.4}
.figure .f-dim{fill:${c.ink};fill-opacity:.75;stroke:${c.panel};stroke-width:1}
.figure .s-0{stroke:${c.ink}}.figure .s-1{stroke:${c.satisfied}}.figure .s-2{stroke:${c.green}}.figure .s-3{stroke:${c.purple}}.figure .s-4{stroke:${c.soft}}.figure .s-5{stroke:${c.frustratedText}}
.figure .s{fill:none;stroke-width:1.9;stroke-linejoin:round}
.figure .b-0{fill:${c.ink}}.figure .b-1{fill:${c.satisfied}}.figure .b-2{fill:${c.green}}.figure .b-3{fill:${c.purple}}.figure .b-4{fill:${c.soft}}.figure .b-5{fill:${c.frustratedText}}
.figure .b{fill-opacity:.13;stroke:none}
.figure .l-1{fill:${c.satisfied}}.figure .l-2{fill:${c.green}}.figure .l-3{fill:${c.purple}}.figure .l-4{fill:${c.soft}}.figure .l-5{fill:${c.frustratedText}}
.figure .cell{fill:${c.ink}}
.figure .on-dark{fill:${c.panel}}
.figure .p-disc{stroke:${c.satisfied};stroke-width:2.6px;stroke-linecap:round;fill:none}
.figure .p-ring{stroke:${c.frustrated};stroke-width:4.6px;stroke-linecap:round;fill:none}
.figure .p-hole{stroke:${c.panel};stroke-width:2px;stroke-linecap:round;fill:none}
.figure .life{fill:${c.frustrated};fill-opacity:.2;stroke:${c.frustrated};stroke-width:1}
.figure .life-chance{fill:${c.faint};stroke:${c.quiet};stroke-width:1;stroke-dasharray:3 3}
`;
}

/**
 * The style sheet of the figures.
 *
 * @param theme - `page` takes the colours from the page's custom properties, so that a figure follows its theme
 */
export function figureStyle(theme: 'light' | 'dark' | 'page'): string {
  if (theme !== 'page') {
    const p: Palette = theme === 'light' ? LIGHT : DARK;
    const { groups: _groups, ramp: _ramp, ...plain } = p;
    return rules(plain);
  }
  const named = (key: string): string => `var(--${key.replace(/[A-Z]/g, (c) => `-${c.toLowerCase()}`)})`;
  return rules(Object.fromEntries(Object.keys(LIGHT).map((key) => [key, named(key)])));
}

/** A figure that stands alone in a file: style, size and ground inside. */
export function standalone(svg: string, theme: 'light' | 'dark', caption = ''): string {
  const box = /viewBox="0 0 ([\d.]+) ([\d.]+)"/.exec(svg);
  const width = Number(box?.[1] ?? 400) + 24;
  const plain = Number(box?.[2] ?? 300) + 24;
  const lines = caption === '' ? [] : wrapped(caption, Math.floor(width / 6.4));
  const height = plain + lines.length * 16;
  const style = figureStyle(theme).replaceAll('\n', '');
  const ground = (theme === 'light' ? LIGHT : DARK).panel;
  return (
    `<?xml version="1.0" encoding="UTF-8"?>\n` +
    svg
      .replace(
        /viewBox="[^"]*"/,
        `viewBox="-12 -12 ${at(width)} ${at(height)}" width="${at(width)}" height="${at(height)}"`,
      )
      .replace(
        '</desc>',
        `</desc><style>${style}</style><rect x="-12" y="-12" width="${at(width)}" height="${at(height)}" fill="${ground}"/>`,
      )
      .replace(
        /<\/svg>$/,
        `${lines.map((line, k) => label(0, plain - 8 + k * 16, line, 'start', 'f-soft')).join('')}</svg>`,
      ) +
    '\n'
  );
}

/** Words broken into lines of at most so many letters. */
export function wrapped(text: string, letters: number): string[] {
  const lines: string[] = [];
  let line = '';
  for (const word of text.split(' ')) {
    if (line !== '' && line.length + 1 + word.length > letters) {
      lines.push(line);
      line = word;
    } else line = line === '' ? word : `${line} ${word}`;
  }
  if (line !== '') lines.push(line);
  return lines;
}
