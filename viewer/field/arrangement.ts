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
  // the farthest few would shrink everyone else: fit all but the outermost 0.2 % and let those be cut at the edge
  const [x0, x1] = reach(layout, 0);
  const [y0, y1] = reach(layout, 1);
  const wide = area.width - 2 * area.side;
  const high = area.height - area.top - area.bottom;
  const scale = Math.min(wide / Math.max(x1 - x0, 1e-6), high / Math.max(y1 - y0, 1e-6));
  const out = new Float32Array(2 * n);
  for (let i = 0; i < n; i++) {
    const x = area.side + wide / 2 + (layout[2 * i] - (x0 + x1) / 2) * scale;
    const y = area.top + high / 2 + (layout[2 * i + 1] - (y0 + y1) / 2) * scale;
    out[2 * i] = Math.max(area.side / 2, Math.min(area.width - area.side / 2, x));
    out[2 * i + 1] = Math.max(area.top / 2, Math.min(area.height - area.bottom / 2, y));
  }
  return out;
}

function reach(layout: Float32Array, offset: number): [number, number] {
  const n = layout.length / 2;
  const values = new Float32Array(n);
  for (let i = 0; i < n; i++) values[i] = layout[2 * i + offset];
  values.sort();
  const cut = Math.floor(n * 0.001);
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
  let widest = 0;
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
    each.push(padded(low, high));
    lowest = Math.min(lowest, low);
    highest = Math.max(highest, high);
    widest = Math.max(widest, high - low);
  }
  if (highest - lowest <= 1.3 * widest) return each.map(() => padded(lowest, highest));
  // one width for all, so that the spreads of two generations can be compared by eye
  return each.map(({ low, high }) => {
    const middle = (low + high) / 2;
    return padded(middle - widest / 2, middle + widest / 2);
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
