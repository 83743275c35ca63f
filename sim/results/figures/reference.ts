/**
 * Whom a household sees: wealth of its neighbours on a log axis, itself, and the aspiration its mix makes of them.
 */
import { scaleLog } from 'd3-scale';
import { at, figure, heldLabel, label, rule, type Size, short, spread, textWidth } from './figure.js';

export interface Seen {
  readonly own: number;
  readonly neighbours: readonly number[];
  readonly aspirations: readonly number[];
  readonly frustrated: boolean;
  /** The mean of everyone, or NaN when the mix leaves society out. */
  readonly society: number;
}

export function referenceFigure(size: Size, s: Seen, title = 'Whom it sees'): string {
  const all = [s.own, ...s.neighbours, ...s.aspirations, s.society].filter((v) => v > 0);
  const low = Math.min(...all) * 0.93;
  const high = Math.max(...all) * 1.07;
  const room = { left: 8, right: size.width - 8 };
  const x = scaleLog().domain([low, high]).range([room.left, room.right]);
  const middle = size.height / 2 + 2;
  const parts = [rule(room.left, middle, room.right, middle, 'f-axis')];
  for (const v of s.neighbours)
    if (v > 0) parts.push(`<circle class="f-dim" cx="${at(x(v))}" cy="${at(middle)}" r="5"/>`);
  // above the line: itself and what it aspires to, kept apart
  const marks = [
    { v: s.own, says: `itself ${short(s.own)}`, own: true },
    ...s.aspirations.map((v, m) => ({
      v,
      says: s.aspirations.length > 1 ? `milestone ${m + 1}: ${short(v)}` : `aspiration ${short(v)}`,
      own: false,
    })),
  ].filter(({ v }) => v > 0);
  const wanted = marks.map(({ v, says }) =>
    Math.max(room.left + textWidth(says) / 2, Math.min(room.right - textWidth(says) / 2, x(v))),
  );
  const places = spread(wanted, marks.length > 2 ? 78 : 104, room.left + 44, room.right - 44);
  marks.forEach((m, k) => {
    parts.push(
      rule(x(m.v), middle - 13, x(m.v), middle + 13, m.own && s.frustrated ? 'f-bar-frustrated' : 'f-bar'),
      label(places[k], middle - 20, m.says, 'middle', m.own && s.frustrated ? 'f-frustrated-text' : 'f-strong'),
    );
  });
  if (s.society > 0) {
    parts.push(rule(x(s.society), middle - 8, x(s.society), middle + 16, 'f-dots'));
    parts.push(
      heldLabel(x(s.society), middle + 29, `mean of everyone ${short(s.society)}`, room.left, room.right, 'f-soft'),
    );
  }
  const richer = s.neighbours.filter((v) => v > s.own).length;
  return figure(
    size,
    title,
    `Has ${short(s.own)} and aspires to ${s.aspirations.map(short).join(' and ')}; ${richer} of ${s.neighbours.length} neighbours are richer.`,
    parts.join(''),
  );
}
