/**
 * Numbers, lists and tables as the report writes them: for readers, with a true minus sign and no more digits than help.
 */
import { safe } from '../figures/figure.js';

/** Stands for a number that is not there. */
export const NONE = '–';

/** A number with about three figures. */
export function num(x: number | null | undefined, figures = 3): string {
  if (x === null || x === undefined || Number.isNaN(x)) return NONE;
  if (!Number.isFinite(x)) return x > 0 ? '∞' : '−∞';
  if (x === 0) return '0';
  const size = Math.abs(x);
  if (size >= 10000) return signed(grouped(Math.round(x)));
  if (size < 0.0005) return signed(x.toExponential(1));
  const text = Number(x.toPrecision(figures)).toString();
  return signed(text.includes('e') ? x.toFixed(0) : text);
}

/** A number with a fixed number of decimals. */
export function fixed(x: number | null | undefined, decimals: number): string {
  if (x === null || x === undefined || !Number.isFinite(x)) return NONE;
  const text = x.toFixed(decimals);
  return signed(Number(text) === 0 ? text.replace('-', '') : text);
}

/** A share as a percentage: a decimal below ten per cent, unless told otherwise. */
export function pct(x: number | null | undefined, decimals?: number): string {
  if (x === null || x === undefined || !Number.isFinite(x)) return NONE;
  const size = Math.abs(100 * x);
  return `${fixed(100 * x, decimals ?? (size < 9.95 && size > 0 ? 1 : 0))} %`;
}

/** A p-value. */
export function pValue(p: number | null | undefined): string {
  if (p === null || p === undefined || !Number.isFinite(p)) return NONE;
  return p < 0.001 ? '< 0.001' : p.toFixed(3);
}

/** A whole number in groups of three. */
export function grouped(n: number): string {
  return String(n).replace(/\B(?=(\d{3})+$)/g, ',');
}

function signed(text: string): string {
  return text.replaceAll('-', '−');
}

/** `1 village`, `2,250 households`. */
export function count(n: number, one: string, many = `${one}s`): string {
  return `${grouped(n)} ${n === 1 ? one : many}`;
}

/** `a`, `a and b`, `a, b and c`. */
export function list(items: readonly string[]): string {
  return items.length < 2 ? (items[0] ?? '') : `${items.slice(0, -1).join(', ')} and ${items[items.length - 1]}`;
}

/** With typographic quotes round names. */
export function typographic(text: string): string {
  return text.replace(/'([^']+)'/g, '‘$1’');
}

/** With a capital letter. */
export function sentence(text: string): string {
  return text === '' ? text : text[0].toUpperCase() + text.slice(1);
}

/** Text for between tags: safe, and a number kept with its per cent sign. */
function text(words: string): string {
  return safe(words).replaceAll(' %', '\u00a0%');
}

/** A paragraph. */
export function p(words: string, name = ''): string {
  return `<p${name === '' ? '' : ` class="${name}"`}>${text(words)}</p>`;
}

/** A bulleted list. */
export function bullets(items: readonly string[]): string {
  return `<ul>${items.map((item) => `<li>${text(item)}</li>`).join('')}</ul>`;
}

/** A head cell over several columns. */
export interface Span {
  readonly text: string;
  readonly columns: number;
}

/**
 * A table that scrolls sideways on a narrow screen.
 *
 * @param head - names of the columns; the first column is text, the others numbers unless `words` says so
 * @param o.words - columns, besides the first, whose cells are words
 */
export function table(
  caption: string,
  head: readonly string[],
  rows: readonly (readonly string[])[],
  o: { readonly over?: readonly Span[]; readonly words?: readonly number[] } = {},
): string {
  const words = new Set([0, ...(o.words ?? [])]);
  const kind = (c: number): string => (words.has(c) ? ' class="w"' : '');
  const over =
    o.over === undefined
      ? ''
      : `<tr><td></td>${o.over.map((span) => `<th scope="colgroup" colspan="${span.columns}">${text(span.text)}</th>`).join('')}</tr>`;
  const top = head
    .map((name, c) => (name === '' ? `<td${kind(c)}></td>` : `<th scope="col"${kind(c)}>${text(name)}</th>`))
    .join('');
  const body = rows
    .map(
      (row) =>
        `<tr>${row
          .map((cell, c) => (c === 0 ? `<th scope="row">${text(cell)}</th>` : `<td${kind(c)}>${text(cell)}</td>`))
          .join('')}</tr>`,
    )
    .join('\n');
  return (
    `<div class="scroll" role="region" tabindex="0" aria-label="${safe(caption)}"><table><caption>${text(caption)}</caption>` +
    `<thead>${over}<tr>${top}</tr></thead><tbody>\n${body}\n</tbody></table></div>`
  );
}

/** A figure with what it says under it. */
export function plate(svg: string, caption: string, name = ''): string {
  return `<figure${name === '' ? '' : ` class="${name}"`}>${svg}<figcaption>${text(caption)}</figcaption></figure>`;
}
