/**
 * Where a household stands in its field: field pixels from the ladder or the map. Pure arithmetic.
 *
 * In the ladder height is log wealth on the shared axis and sideways is the household's place in the network; the
 * map keeps its own proportions in the middle of the field.
 */

export type Arrangement = 'ladder' | 'map';

/** Log-wealth axis shared by both fields and the pyramid. */
export interface Axis {
  /** Natural log of wealth at the foot and the head. */
  readonly low: number;
  readonly high: number;
}

/** Drawing area of a field: its size and the room kept for its texts, CSS pixels. */
export interface Area {
  readonly width: number;
  readonly height: number;
  readonly top: number;
  readonly bottom: number;
  readonly side: number;
}

/** Height of a wealth in field pixels; wealth of 0 lies at the foot. */
export function heightOf(wealth: number, axis: Axis, area: Area): number {
  const share = wealth > 0 ? (Math.log(wealth) - axis.low) / (axis.high - axis.low) : 0;
  return area.top + (1 - Math.max(-0.02, Math.min(1.02, share))) * (area.height - area.top - area.bottom);
}

/**
 * Positions of the ladder.
 *
 * @param sideways - place in the network, 0 … 1, length n
 * @returns x, y by household in field pixels, length 2 n
 */
export function onLadder(sideways: Float32Array, wealth: Float64Array, axis: Axis, area: Area): Float32Array {
  const n = sideways.length;
  const out = new Float32Array(2 * n);
  const wide = area.width - 2 * area.side;
  for (let i = 0; i < n; i++) {
    out[2 * i] = area.side + sideways[i] * wide;
    out[2 * i + 1] = heightOf(wealth[i], axis, area);
  }
  return out;
}

/**
 * Positions of the map, fitted to the field without changing its proportions.
 *
 * @param layout - x, y by household in any unit, length 2 n
 */
export function onMap(layout: Float32Array, area: Area): Float32Array {
  const n = layout.length / 2;
  // the farthest few would shrink everyone else: fit all but the outermost 1 % each way, and draw those in the margin
  const [x0, x1] = reach(layout, 0);
  const [y0, y1] = reach(layout, 1);
  const margin = area.side * 1.5;
  const wide = area.width - 2 * area.side - 2 * margin;
  const high = area.height - area.top - area.bottom - 2 * margin;
  const scale = Math.min(wide / Math.max(x1 - x0, 1e-6), high / Math.max(y1 - y0, 1e-6));
  const out = new Float32Array(2 * n);
  // beyond the fitted box distances shrink smoothly, and the order outward stays
  const inside = (v: number, half: number, room: number): number => {
    const over = Math.abs(v) - half;
    return over <= 0 ? v : Math.sign(v) * (half + room * (1 - Math.exp(-over / room)));
  };
  for (let i = 0; i < n; i++) {
    const x = (layout[2 * i] - (x0 + x1) / 2) * scale;
    const y = (layout[2 * i + 1] - (y0 + y1) / 2) * scale;
    out[2 * i] = area.width / 2 + inside(x, wide / 2, margin);
    out[2 * i + 1] = area.top + (area.height - area.top - area.bottom) / 2 + inside(y, high / 2, margin);
  }
  return out;
}

function reach(layout: Float32Array, offset: number): [number, number] {
  const n = layout.length / 2;
  const values = new Float32Array(n);
  for (let i = 0; i < n; i++) values[i] = layout[2 * i + offset];
  values.sort();
  const cut = Math.floor(n * 0.01);
  return [values[cut], values[n - 1 - cut]];
}

/**
 * The axis of every generation. One for all while growth leaves each generation legible; else the axis follows
 * the households up, so that spread is never squashed by growth.
 *
 * @param extents - min, max wealth by generation of each arm (NaN where unknown)
 */
export function axes(extents: readonly Float64Array[]): Axis[] {
  const T = extents.length > 0 ? extents[0].length / 2 : 0;
  const each: Axis[] = [];
  let lowest = Infinity;
  let highest = -Infinity;
  const widths: number[] = [];
  for (let t = 0; t < T; t++) {
    let low = Infinity;
    let high = -Infinity;
    for (const e of extents) {
      if (e[2 * t] > 0) low = Math.min(low, Math.log(e[2 * t]));
      if (e[2 * t + 1] > 0) high = Math.max(high, Math.log(e[2 * t + 1]));
    }
    if (!(high > low)) {
      low = Number.isFinite(low) ? low - 0.5 : 0;
      high = Number.isFinite(high) ? high + 0.5 : 1;
    }
    each.push({ low, high });
    lowest = Math.min(lowest, low);
    highest = Math.max(highest, high);
    widths.push(high - low);
  }
  const common = [...widths].sort((a, b) => a - b)[Math.floor(widths.length / 2)] ?? 1;
  if (highest - lowest <= 1.35 * common) return each.map(() => padded(lowest, highest));
  // one width wherever the households fit into it, so that the spreads of two generations can be compared by eye
  return each.map(({ low, high }) => {
    const middle = (low + high) / 2;
    const half = Math.max(common, high - low) / 2;
    return padded(middle - half, middle + half);
  });
}

function padded(low: number, high: number): Axis {
  const room = Math.max(0.05, 0.04 * (high - low));
  return { low: low - room, high: high + room };
}

/** Round wealths to draw lines at: 1, 2, 5 × powers of ten, thinned to at most `most`. */
export function rungs(axis: Axis, most: number): number[] {
  const sets = [[1, 2, 5], [1, 3], [1]];
  for (const set of sets) {
    const list: number[] = [];
    for (let p = Math.floor(axis.low / Math.LN10); p <= Math.ceil(axis.high / Math.LN10); p++) {
      for (const m of set) {
        const v = m * 10 ** p;
        if (Math.log(v) > axis.low && Math.log(v) < axis.high) list.push(Number(v.toPrecision(1)));
      }
    }
    if (list.length <= most) return list;
  }
  const list: number[] = [];
  const step = Math.ceil((axis.high - axis.low) / Math.LN10 / most);
  for (let p = Math.ceil(axis.low / Math.LN10); p < axis.high / Math.LN10; p += step) list.push(Number(`1e${p}`));
  return list;
}
