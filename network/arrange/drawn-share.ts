/**
 * Does a drawing overstate segregation? The share of drawn neighbours of one's own group, beside that of ties.
 */
import { ShapeError } from '../errors.js';
import type { Ties } from '../graph.js';

/** Nearest households looked at: about as many as a reader takes in round a mark. */
const NEAREST = 8;

/**
 * Share of same-group households among each household's nearest in the drawing, averaged over households.
 *
 * @param positions - x, y by household, length 2n
 * @param group - labels, length n
 * @param nearest - how many neighbours to look at
 * @returns 0 … 1; NaN below two households. Cost about O(n · nearest) on an even drawing, by a grid of square cells.
 */
export function drawnSameGroupShare(positions: ArrayLike<number>, group: ArrayLike<number>, nearest = NEAREST): number {
  const n = group.length;
  if (positions.length !== 2 * n)
    throw new ShapeError('positions', positions.length, 2 * n, 'x and y of each household');
  const k = Math.min(nearest, n - 1);
  if (k < 1) return NaN;
  const grid = new Cells(positions, n);
  const distance = new Float64Array(k);
  const found = new Int32Array(k);
  let same = 0;
  for (let i = 0; i < n; i++) {
    const count = grid.nearest(i, k, distance, found);
    let own = 0;
    for (let a = 0; a < count; a++) if (group[found[a]] === group[i]) own++;
    same += own / count;
  }
  return same / n;
}

/** Share of tie ends whose other end is of the same group; NaN without ties. Cost O(n + m). */
export function tiedSameGroupShare(ties: Ties, group: ArrayLike<number>): number {
  const { n, start, target } = ties;
  let same = 0;
  for (let i = 0; i < n; i++) {
    for (let e = start[i]; e < start[i + 1]; e++) if (group[target[e]] === group[i]) same++;
  }
  return same / target.length;
}

/** Points in square cells, two a cell on average, cells sorted into rows. */
class Cells {
  private readonly positions: ArrayLike<number>;
  private readonly columns: number;
  private readonly left: number;
  private readonly top: number;
  private readonly side: number;
  private readonly start: Uint32Array;
  private readonly member: Uint32Array;

  constructor(positions: ArrayLike<number>, n: number) {
    let left = Infinity;
    let right = -Infinity;
    let top = Infinity;
    let bottom = -Infinity;
    for (let i = 0; i < n; i++) {
      left = Math.min(left, positions[2 * i]);
      right = Math.max(right, positions[2 * i]);
      top = Math.min(top, positions[2 * i + 1]);
      bottom = Math.max(bottom, positions[2 * i + 1]);
    }
    this.positions = positions;
    this.columns = Math.max(1, Math.floor(Math.sqrt(n / 2)));
    this.left = left;
    this.top = top;
    this.side = Math.max(right - left, bottom - top) / this.columns || 1;
    const columns = this.columns;
    this.start = new Uint32Array(columns * columns + 1);
    for (let i = 0; i < n; i++) this.start[this.cell(i) + 1]++;
    for (let c = 0; c < columns * columns; c++) this.start[c + 1] += this.start[c];
    const fill = this.start.slice(0, columns * columns);
    this.member = new Uint32Array(n);
    for (let i = 0; i < n; i++) this.member[fill[this.cell(i)]++] = i;
  }

  private column(x: number): number {
    return Math.min(this.columns - 1, Math.max(0, Math.floor((x - this.left) / this.side)));
  }

  private row(y: number): number {
    return Math.min(this.columns - 1, Math.max(0, Math.floor((y - this.top) / this.side)));
  }

  private cell(i: number): number {
    return this.row(this.positions[2 * i + 1]) * this.columns + this.column(this.positions[2 * i]);
  }

  /** Fills `found` with the k nearest of i (itself left out) and returns how many there are. */
  nearest(i: number, k: number, distance: Float64Array, found: Int32Array): number {
    const { positions, columns, start, member } = this;
    const x = positions[2 * i];
    const y = positions[2 * i + 1];
    const cx = this.column(x);
    const cy = this.row(y);
    let count = 0;
    for (let ring = 0; ring < columns; ring++) {
      // cells of this ring are at least (ring − 1) sides away
      const reach = (ring - 1) * this.side;
      if (count === k && reach > 0 && reach * reach > distance[k - 1]) break;
      for (let r = Math.max(0, cy - ring); r <= Math.min(columns - 1, cy + ring); r++) {
        const edge = r === cy - ring || r === cy + ring;
        for (let c = Math.max(0, cx - ring); c <= Math.min(columns - 1, cx + ring); c++) {
          if (!edge && c !== cx - ring && c !== cx + ring) continue;
          for (let at = start[r * columns + c]; at < start[r * columns + c + 1]; at++) {
            const j = member[at];
            if (j === i) continue;
            const dx = positions[2 * j] - x;
            const dy = positions[2 * j + 1] - y;
            const squared = dx * dx + dy * dy;
            if (count === k && squared >= distance[k - 1]) continue;
            let slot = count < k ? count++ : k - 1;
            while (slot > 0 && distance[slot - 1] > squared) {
              distance[slot] = distance[slot - 1];
              found[slot] = found[slot - 1];
              slot--;
            }
            distance[slot] = squared;
            found[slot] = j;
          }
        }
      }
    }
    return count;
  }
}
