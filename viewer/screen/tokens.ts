/**
 * Colours of the drawn marks, as the shaders need them: the palette of the figures in numbers.
 */
export { DARK, LIGHT, type Palette as Tokens } from '../../sim/results/figures/palette.js';

/** Red, green and blue of `#rrggbb`, 0 … 255. */
export function rgb(hex: string): readonly [number, number, number] {
  const v = Number.parseInt(hex.slice(1), 16);
  return [v >> 16, (v >> 8) & 255, v & 255];
}

/** A colour part of the way between two, as `#rrggbb`. */
export function mix(a: string, b: string, share: number): string {
  const p = rgb(a);
  const q = rgb(b);
  const part = (k: number): string =>
    Math.round(p[k] + (q[k] - p[k]) * share)
      .toString(16)
      .padStart(2, '0');
  return `#${part(0)}${part(1)}${part(2)}`;
}
