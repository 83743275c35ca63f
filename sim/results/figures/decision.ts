/**
 * Decision anatomy: lifetime utility against planned child wealth for one household now, with every local peak, the
 * milestones, the choice and by how much the best other peak falls short.
 *
 * The curve is the engine's own objective at the points given; nothing is smoothed.
 */
import { scaleLinear } from 'd3-scale';
import { at, figure, heldLabel, label, rule, type Size, short, textWidth } from './figure.js';

export interface Peak {
  readonly planned: number;
  readonly utility: number;
  readonly met: number;
}

export interface Decision {
  /** Planned child wealth, ascending. */
  readonly planned: ArrayLike<number>;
  readonly utility: ArrayLike<number>;
  readonly peaks: readonly Peak[];
  /** Index of the choice in `peaks`. */
  readonly chosen: number;
  readonly aspirations: readonly number[];
}

/**
 * How far another peak falls short of the choice, as growth of consumption would make up for it is not known here:
 * the share of the curve's own height between the choice and the lowest point shown.
 */
export function shortfall(d: Decision, peak: Peak): number {
  const best = d.peaks[d.chosen].utility;
  let lowest = Infinity;
  for (let k = 0; k < d.utility.length; k++) if (Number.isFinite(d.utility[k])) lowest = Math.min(lowest, d.utility[k]);
  return best > lowest ? (best - peak.utility) / (best - lowest) : 0;
}

export function decisionFigure(
  size: Size,
  d: Decision,
  title = 'The decision: lifetime utility against planned child wealth',
): string {
  const room = { left: 6, right: size.width - 6, top: 40, bottom: size.height - 34 };
  const n = d.planned.length;
  let low = Infinity;
  let high = -Infinity;
  for (let k = 0; k < n; k++) {
    if (!Number.isFinite(d.utility[k])) continue;
    low = Math.min(low, d.utility[k]);
    high = Math.max(high, d.utility[k]);
  }
  const chosen = d.peaks[d.chosen];
  if (chosen !== undefined) high = Math.max(high, chosen.utility);
  // the far ends of the plan (no consumption, or no bequest) may fall without bound: show the top part of the curve
  const values = Array.from({ length: n }, (_, k) => d.utility[k])
    .filter(Number.isFinite)
    .sort((a, b) => a - b);
  const floor = values[Math.floor(values.length * 0.06)] ?? low;
  low = Math.max(low, high - 1.6 * (high - floor));
  const x = scaleLinear()
    .domain([d.planned[0], d.planned[n - 1]])
    .range([room.left, room.right]);
  const y = scaleLinear().domain([low, high]).range([room.bottom, room.top]);
  const parts: string[] = [];
  parts.push(rule(room.left, room.bottom, room.right, room.bottom, 'f-axis'));
  for (const t of x.ticks(Math.max(2, Math.floor(size.width / 90)))) {
    if (x(t) < room.left + 8 || x(t) > room.right - 12) continue;
    parts.push(
      rule(x(t), room.bottom, x(t), room.bottom + 4, 'f-axis'),
      label(x(t), room.bottom + 16, short(t), 'middle', 'f-soft'),
    );
  }
  parts.push(label((room.left + room.right) / 2, size.height - 3, 'planned child wealth', 'middle', 'f-soft'));
  d.aspirations.forEach((a, m) => {
    if (!(a > d.planned[0] && a < d.planned[n - 1])) return;
    parts.push(rule(x(a), 16, x(a), room.bottom, 'f-dash'));
    const says = d.aspirations.length > 1 ? `milestone ${m + 1}: ${short(a)}` : `aspiration ${short(a)}`;
    const wide = textWidth(says);
    const toRight = x(a) + wide + 6 < room.right;
    parts.push(label(toRight ? x(a) + 5 : x(a) - 5, 12 + (m % 2) * 13, says, toRight ? 'start' : 'end'));
  });
  let path = '';
  let pen = false;
  for (let k = 0; k < n; k++) {
    const v = d.utility[k];
    if (!Number.isFinite(v) || v < low - (high - low)) {
      pen = false;
      continue;
    }
    path += `${pen ? 'L' : 'M'}${at(x(d.planned[k]))} ${at(y(Math.max(low, v)))}`;
    pen = true;
  }
  parts.push(`<path class="f-line" d="${path}"/>`);
  const others = d.peaks
    .map((p, k) => ({ p, k }))
    .filter(({ k, p }) => k !== d.chosen && p.utility > low)
    .sort((a, b) => b.p.utility - a.p.utility);
  for (const { p } of others)
    parts.push(`<circle class="f-open" cx="${at(x(p.planned))}" cy="${at(y(p.utility))}" r="4.5"/>`);
  let told = `The choice is to plan for ${chosen === undefined ? '–' : short(chosen.planned)}.`;
  if (chosen !== undefined) {
    const cx = x(chosen.planned);
    const cy = y(chosen.utility);
    parts.push(`<circle class="${chosen.met === 0 ? 'f-ring' : 'f-disc'}" cx="${at(cx)}" cy="${at(cy)}" r="6"/>`);
    parts.push(heldLabel(cx, cy - 11, `plans ${short(chosen.planned)}`, room.left, room.right, 'f-strong f-over'));
    const next = others[0];
    if (next !== undefined) {
      const px = x(next.p.planned);
      const py = y(next.p.utility);
      const lost = shortfall(d, next.p);
      const says = `planning ${short(next.p.planned)} is worth less`;
      const close = Math.abs(px - cx) < (textWidth(says) + 60) / 2 && Math.abs(py - cy) < 26;
      parts.push(rule(px, py, px, cy, 'f-dots'));
      parts.push(
        heldLabel(px, close ? py + 20 : Math.max(py - 10, room.top - 8), says, room.left, room.right, 'f-soft f-over'),
      );
      told += ` The other peak, planning for ${short(next.p.planned)}, lies ${percentOf(lost)} of the drawn height lower.`;
    }
  }
  return figure(size, title, told, parts.join(''));
}

function percentOf(share: number): string {
  return share < 0.01 ? 'under 1 %' : `${Math.round(share * 100)} %`;
}
