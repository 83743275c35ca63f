/**
 * Wealth of two arms back to back on one log axis, stacked by status: the pyramid of the viewer, for paper.
 */
import { scaleLinear } from 'd3-scale';
import { at, figure, label, rule, type Size, short } from './figure.js';

export interface ArmWealth {
  readonly name: string;
  readonly wealth: Float64Array;
  /** Milestones met, or null where nobody has decided. */
  readonly met: Uint8Array | null;
}

export function densitiesFigure(size: Size, left: ArmWealth, right: ArmWealth, title: string, bins = 26): string {
  const room = { top: 24, bottom: size.height - 8 };
  let low = Infinity;
  let high = -Infinity;
  for (const { wealth } of [left, right])
    for (const w of wealth) {
      if (!(w > 0)) continue;
      low = Math.min(low, Math.log(w));
      high = Math.max(high, Math.log(w));
    }
  if (!(high > low)) [low, high] = [low - 0.5, low + 0.5];
  const y = scaleLinear().domain([low, high]).range([room.bottom, room.top]);
  const middle = size.width / 2;
  const gap = 22;
  const sides = [left, right].map(({ wealth, met }) => {
    const all = new Float64Array(bins);
    const frustrated = new Float64Array(bins);
    wealth.forEach((w, i) => {
      const k = w > 0 ? Math.max(0, Math.min(bins - 1, Math.floor(((Math.log(w) - low) / (high - low)) * bins))) : 0;
      all[k] += 1 / wealth.length;
      if (met !== null && met[i] === 0) frustrated[k] += 1 / wealth.length;
    });
    const sorted = wealth.slice().sort();
    return { all, frustrated, median: sorted[Math.floor(sorted.length / 2)] };
  });
  const most = Math.max(...sides.map(({ all }) => Math.max(...all)), 1e-9);
  const reach = middle - gap - 4;
  const parts: string[] = [];
  sides.forEach(({ all, frustrated, median }, s) => {
    const sign = s === 0 ? -1 : 1;
    const zero = middle + sign * gap;
    const step = (room.bottom - room.top) / bins;
    for (let k = 0; k < bins; k++) {
      const top = room.bottom - (k + 1) * step;
      const rect = (from: number, wide: number, name: string): string =>
        wide < 0.05
          ? ''
          : `<rect class="${name}" x="${at(sign > 0 ? zero + from : zero - from - wide)}" y="${at(top)}" width="${at(wide)}" height="${at(step - 1)}"/>`;
      const f = (frustrated[k] / most) * reach;
      parts.push(rect(0, f, 'f-frustrated'), rect(f, (all[k] / most) * reach - f, 'f-satisfied'));
    }
    const m = y(Math.log(Math.max(median, 1e-300)));
    parts.push(rule(zero, m, zero + sign * reach, m, 'f-dash'));
  });
  parts.push(
    label(middle - gap, 12, left.name, 'end', 'f-head'),
    label(middle + gap, 12, right.name, 'start', 'f-head'),
  );
  for (const w of roundWealths(low, high)) parts.push(label(middle, y(Math.log(w)) + 4, short(w), 'middle', 'f-soft'));
  return figure(
    size,
    title,
    `Wealth densities of ${left.name} and ${right.name} on a log axis, frustrated households next to the axis. Medians ${short(sides[0].median)} and ${short(sides[1].median)}, dashed.`,
    parts.join(''),
  );
}

/** 1, 2, 5 × powers of ten between two logs, thinned to at most so many. */
export function roundWealths(low: number, high: number, most = 7): number[] {
  for (const set of [[1, 2, 5], [1, 3], [1]]) {
    const list: number[] = [];
    for (let p = Math.floor(low / Math.LN10); p <= Math.ceil(high / Math.LN10); p++)
      for (const m of set) {
        const v = Number(`${m}e${p}`);
        if (Math.log(v) > low && Math.log(v) < high) list.push(v);
      }
    if (list.length <= most) return list;
  }
  // many powers of ten: every second, third …
  const first = Math.ceil(low / Math.LN10);
  const last = Math.floor(high / Math.LN10);
  const step = Math.max(1, Math.ceil((last - first + 1) / Math.max(1, most)));
  const list: number[] = [];
  for (let p = first; p <= last; p += step) list.push(Number(`1e${p}`));
  return list;
}
