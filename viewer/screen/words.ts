/**
 * Numbers and counts in words, the same everywhere on the screen.
 */

/** A wealth to two or three figures: 4.2, 65, 1 240, 3.1 million. */
export function amount(value: number): string {
  if (!Number.isFinite(value)) return '–';
  const size = Math.abs(value);
  if (size >= 1e6) return `${short(value / 1e6)} million`;
  if (size >= 1000) return String(Math.round(value)).replace(/\B(?=(\d{3})+$)/g, '\u202f');
  return short(value);
}

function short(value: number): string {
  const size = Math.abs(value);
  if (size >= 100) return value.toFixed(0);
  if (size >= 10) return value.toFixed(0);
  if (size >= 1) return value.toFixed(1).replace(/\.0$/, '');
  if (size === 0) return '0';
  return String(Number(value.toPrecision(2)));
}

/** A share as a whole percentage: `31 %`. */
export function percent(share: number): string {
  return Number.isFinite(share) ? `${Math.round(share * 100)}\u202f%` : '–';
}

/** A p-value: two figures, or `< 0.01`. */
export function pValue(p: number): string {
  if (!Number.isFinite(p)) return 'not tested';
  return p < 0.01 ? p.toFixed(3) : p.toFixed(2);
}

export function plural(count: number, one: string, many = `${one}s`): string {
  return `${count.toLocaleString('en').replaceAll(',', '\u202f')} ${count === 1 ? one : many}`;
}
