/**
 * A field on paper: households as dots on the ladder, discs satisfied and open rings frustrated.
 *
 * All marks of a kind are one path of round-ended points, about ten bytes each, so that both arms at three
 * generations stay small enough to send.
 */
import { scaleLinear } from 'd3-scale';
import { roundWealths } from './densities.js';
import { figure, label, percent, rule, type Size, short } from './figure.js';

export interface FieldOnPaper {
  readonly name: string;
  /** Sideways place on the ladder, 0 … 1. */
  readonly sideways: ArrayLike<number>;
  readonly wealth: ArrayLike<number>;
  readonly met: ArrayLike<number>;
}

export function fieldFigure(size: Size, f: FieldOnPaper, logRange: readonly [number, number], title: string): string {
  const room = { left: 34, right: size.width - 6, top: 20, bottom: size.height - 6 };
  const x = scaleLinear().range([room.left + 4, room.right - 4]);
  const y = scaleLinear().domain(logRange).range([room.bottom, room.top]);
  const parts: string[] = [label(room.left, 12, f.name, 'start', 'f-head')];
  for (const w of roundWealths(logRange[0], logRange[1]))
    parts.push(
      rule(room.left, y(Math.log(w)), room.right, y(Math.log(w)), 'f-grid'),
      label(room.left - 5, y(Math.log(w)) + 4, short(w), 'end', 'f-soft'),
    );
  let discs = '';
  let rings = '';
  let frustrated = 0;
  for (let i = 0; i < f.wealth.length; i++) {
    const point = `M${x(f.sideways[i]).toFixed(0)} ${y(Math.log(Math.max(f.wealth[i], 1e-300))).toFixed(0)}h0`;
    if (f.met[i] === 0) {
      rings += point;
      frustrated++;
    } else discs += point;
  }
  parts.push(
    `<path class="p-disc" d="${discs}"/>`,
    `<path class="p-ring" d="${rings}"/>`,
    `<path class="p-hole" d="${rings}"/>`,
  );
  return figure(
    size,
    title,
    `Each household by its wealth, places side by side from poorer to richer; ${percent(frustrated / Math.max(1, f.wealth.length))} frustrated, drawn as open rings.`,
    parts.join(''),
  );
}
