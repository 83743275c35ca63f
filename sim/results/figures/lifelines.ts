/**
 * Life lines of pockets: a band a pocket through the generations it stood, as high as it was large; bands that
 * merge or split are joined. Pockets that are not more than chance are drawn hollow.
 */
import { scaleLinear, scaleSqrt } from 'd3-scale';
import { at, figure, label, rule, type Size } from './figure.js';

export interface PocketMoment {
  readonly pocket: number;
  readonly generation: number;
  readonly size: number;
  readonly pValue: number;
  /** Pocket of the generation before that it came from, or −1. */
  readonly parent: number;
}

export interface LifeOptions {
  readonly title: string;
  readonly generations: number;
  readonly now?: number;
  readonly level?: number;
}

export function lifelinesFigure(size: Size, moments: readonly PocketMoment[], o: LifeOptions): string {
  const room = { left: 8, right: size.width - 8, top: 8, bottom: size.height - 20 };
  const level = o.level ?? 0.05;
  const x = scaleLinear()
    .domain([0, Math.max(1, o.generations - 1)])
    .range([room.left + 10, room.right - 10]);
  // one lane a pocket, the longest-lived and largest first
  const lives = new Map<number, PocketMoment[]>();
  for (const m of moments) lives.set(m.pocket, [...(lives.get(m.pocket) ?? []), m]);
  const total = (list: readonly PocketMoment[]): number => list.reduce((sum, m) => sum + m.size, 0);
  const largest = [...lives.values()].sort((a, b) => total(b) - total(a));
  const lanes = Math.max(1, Math.min(largest.length, Math.floor((room.bottom - room.top) / 11)));
  const shown = largest.slice(0, lanes).sort((a, b) => a[0].generation - b[0].generation || total(b) - total(a));
  const step = (room.bottom - room.top) / lanes;
  const most = Math.max(1, ...moments.map((m) => m.size));
  const thick = scaleSqrt()
    .domain([0, most])
    .range([1.5, Math.min(22, step * 0.9)]);
  const lane = new Map<number, number>();
  shown.forEach((list, k) => {
    lane.set(list[0].pocket, room.top + (k + 0.5) * step);
  });
  const parts: string[] = [];
  for (let t = 0; t < o.generations; t++) {
    parts.push(rule(x(t), room.top, x(t), room.bottom, t === o.now ? 'f-dots' : 'f-grid'));
    if (o.generations <= 14 || t % Math.ceil(o.generations / 14) === 0)
      parts.push(label(x(t), size.height - 4, String(t), 'middle', t === o.now ? 'f-strong' : 'f-soft'));
  }
  const joins: string[] = [];
  for (const list of shown) {
    const y = lane.get(list[0].pocket) as number;
    const sorted = [...list].sort((a, b) => a.generation - b.generation);
    const chance = !sorted.some((m) => m.pValue <= level);
    let above = '';
    let below = '';
    const first = sorted[0];
    const parentLane = first.parent >= 0 && first.parent !== first.pocket ? lane.get(first.parent) : undefined;
    if (parentLane !== undefined && first.generation > 0)
      joins.push(
        `<path class="f-thin" d="M${at(x(first.generation - 1))} ${at(parentLane)}C${at(x(first.generation - 0.5))} ${at(parentLane)} ${at(x(first.generation - 0.5))} ${at(y)} ${at(x(first.generation))} ${at(y)}"/>`,
      );
    sorted.forEach((m, k) => {
      const h = thick(m.size) / 2;
      if (k === 0) {
        above += `M${at(x(m.generation) - 5)} ${at(y)}Q${at(x(m.generation) - 5)} ${at(y - h)} ${at(x(m.generation))} ${at(y - h)}`;
      } else above += `L${at(x(m.generation))} ${at(y - h)}`;
      below = `L${at(x(m.generation))} ${at(y + h)}${below}`;
      if (k === sorted.length - 1) {
        above += `Q${at(x(m.generation) + 5)} ${at(y - h)} ${at(x(m.generation) + 5)} ${at(y)}Q${at(x(m.generation) + 5)} ${at(y + h)} ${at(x(m.generation))} ${at(y + h)}`;
      }
    });
    parts.push(`<path class="${chance ? 'life-chance' : 'life'}" d="${above}${below}Z"/>`);
  }
  if (moments.length === 0)
    parts.push(label(size.width / 2, size.height / 2, 'no pocket in this replicate', 'middle', 'f-soft'));
  const hidden = largest.length - shown.length;
  return figure(
    size,
    o.title,
    `${largest.length} pockets over ${o.generations} generations${hidden > 0 ? `; the ${shown.length} largest are drawn` : ''}.`,
    joins.join('') + parts.join(''),
  );
}
