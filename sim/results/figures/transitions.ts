/**
 * Transition matrices between wealth quintiles of parents and children, one an arm, side by side.
 */
import { at, figure, label, type Size } from './figure.js';

export interface Transition {
  readonly name: string;
  /** 25 shares, row = quintile of the parent (poorest first), column = of the child; a row sums to 1. */
  readonly share: ArrayLike<number>;
}

export function transitionsFigure(size: Size, arms: readonly Transition[], title: string): string {
  const parts: string[] = [];
  const gap = 20;
  const cell = Math.min((size.width - 52 - gap * (arms.length - 1)) / (5 * arms.length), (size.height - 54) / 5);
  const stay: string[] = [];
  arms.forEach((arm, k) => {
    const x0 = 52 + k * (5 * cell + gap);
    const y0 = 20;
    parts.push(label(x0, 12, arm.name, 'start', 'f-head'));
    for (let r = 0; r < 5; r++) {
      // richest on top, as on the ladder
      const row = 4 - r;
      if (k === 0)
        parts.push(
          label(x0 - 8, y0 + (r + 0.5) * cell + 4, row === 4 ? 'richest' : row === 0 ? 'poorest' : '', 'end', 'f-soft'),
        );
      for (let c = 0; c < 5; c++) {
        const v = arm.share[5 * row + c];
        const x = x0 + c * cell;
        const y = y0 + r * cell;
        const strength = Math.min(1, Math.max(0, v) * 1.25);
        parts.push(
          `<rect class="cell" x="${at(x + 0.8)}" y="${at(y + 0.8)}" width="${at(cell - 1.6)}" height="${at(cell - 1.6)}" rx="2" fill-opacity="${at(0.04 + 0.9 * strength)}"/>`,
        );
        if (cell > 21 && Number.isFinite(v))
          parts.push(
            label(
              x + cell / 2,
              y + cell / 2 + 4.5,
              String(Math.round(100 * v)),
              'middle',
              strength > 0.5 ? 'on-dark' : 'f-text',
            ),
          );
      }
    }
    const foot = y0 + 5 * cell + 15;
    if (5 * cell > 112)
      parts.push(
        label(x0, foot, 'poorest', 'start', 'f-soft'),
        label(x0 + 5 * cell, foot, 'richest child', 'end', 'f-soft'),
      );
    stay.push(`${arm.name}: ${Math.round(100 * arm.share[0])} % of the poorest fifth's children stay in it`);
  });
  if (5 * cell <= 112) parts.push(label(52, 20 + 5 * cell + 15, 'child: poorest to richest →', 'start', 'f-soft'));
  return figure(
    size,
    title,
    `Shares of children by quintile, in percent of the parents' quintile. ${stay.join('; ')}.`,
    parts.join(''),
  );
}
