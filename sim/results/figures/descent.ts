/**
 * A line of descent: what each generation of a household had and aspired to, with its status marks.
 */
import { scaleLinear, scaleLog } from 'd3-scale';
import { roundWealths } from './densities.js';
import { at, figure, label, rule, type Size, short, spread } from './figure.js';

export interface Descent {
  /** Wealth by generation 0 … T, T + 1 values. */
  readonly wealth: ArrayLike<number>;
  /** Aspiration of the first milestone by generation 0 … T − 1. */
  readonly aspiration: ArrayLike<number>;
  /** Milestones met, 0 … T − 1. */
  readonly met: ArrayLike<number>;
  readonly now: number;
}

export function descentFigure(size: Size, d: Descent, title = 'Line of descent: wealth and aspiration'): string {
  const T = d.wealth.length - 1;
  const room = { left: 40, right: size.width - 54, top: 12, bottom: size.height - 22 };
  let low = Infinity;
  let high = 0;
  for (const list of [d.wealth, d.aspiration])
    for (let t = 0; t < list.length; t++) {
      if (list[t] > 0) low = Math.min(low, list[t]);
      high = Math.max(high, list[t]);
    }
  if (!(high > low)) [low, high] = [Math.max(low * 0.8, 1e-6), Math.max(high, 1e-6) * 1.25];
  const x = scaleLinear().domain([0, T]).range([room.left, room.right]);
  const y = scaleLog().domain([low, high]).range([room.bottom, room.top]);
  const parts: string[] = [];
  const round = roundWealths(
    Math.log(low) - 1e-9,
    Math.log(high) + 1e-9,
    Math.max(2, Math.floor((room.bottom - room.top) / 26)),
  );
  // a narrow range may hold no round number: then its ends
  const ticks = round.length > 1 ? round : [low, high];
  for (const t of ticks)
    parts.push(
      rule(room.left, y(t), room.right, y(t), 'f-grid'),
      label(room.left - 8, y(t) + 4, short(t), 'end', 'f-soft'),
    );
  const step = Math.max(1, Math.ceil(T / Math.max(1, (room.right - room.left) / 30)));
  for (let t = 0; t <= T; t += step)
    parts.push(label(x(t), size.height - 4, String(t), 'middle', t === d.now ? 'f-strong' : 'f-soft'));
  parts.push(rule(x(d.now), room.top, x(d.now), room.bottom, 'f-dots'));
  const path = (list: ArrayLike<number>): string => {
    let out = '';
    for (let t = 0; t < list.length; t++) out += `${t === 0 ? 'M' : 'L'}${at(x(t))} ${at(y(Math.max(low, list[t])))}`;
    return out;
  };
  parts.push(`<path class="f-dash" d="${path(d.aspiration)}"/>`, `<path class="f-thin" d="${path(d.wealth)}"/>`);
  for (let t = 0; t <= T; t++) {
    const decided = t < d.met.length;
    const name = !decided ? 'f-quiet' : d.met[t] === 0 ? 'f-ring' : 'f-disc';
    parts.push(
      `<circle class="${name}" cx="${at(x(t))}" cy="${at(y(Math.max(low, d.wealth[t])))}" r="${t === d.now ? 5.6 : 4.2}"/>`,
    );
  }
  const lastA = y(d.aspiration[d.aspiration.length - 1]);
  const lastW = y(Math.max(low, d.wealth[T]));
  const [labelA, labelW] = spread([lastA + 4, lastW + 4], 15, room.top + 6, room.bottom + 4);
  parts.push(
    label(room.right + 10, labelA, 'aspires', 'start', 'f-text'),
    label(room.right + 10, labelW, 'has', 'start', 'f-soft'),
  );
  const frustrated = Array.from(d.met).filter((m) => m === 0).length;
  return figure(
    size,
    title,
    `Wealth goes from ${short(d.wealth[0])} to ${short(d.wealth[T])} over ${T} generations; frustrated in ${frustrated} of ${d.met.length}.`,
    parts.join(''),
  );
}
