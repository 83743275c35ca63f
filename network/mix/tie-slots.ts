/**
 * Ties that can be swapped: a list of pairs kept together with each household's row of neighbours.
 *
 * A degree-preserving swap turns the ties a–b and c–d into a–d and c–b (Maslov and Sneppen 2002). Row lengths never
 * change, so rows are rewritten in place and asking whether two households are tied is a scan of the shorter row: on
 * the short rows of social networks that beats a hash table. Weights stay with the tie's number.
 */
import { fromPairs, type Ties, toPairs } from '../graph.js';

export class TieSlots {
  readonly n: number;
  /** Ends of each tie, length m; a swap exchanges far ends (`target`). */
  readonly source: Uint32Array;
  readonly target: Uint32Array;
  /** Row offsets, length n + 1. */
  readonly start: Uint32Array;
  private readonly row: Uint32Array;
  /** Where in its rows a tie stands: at its source's row (neighbour = target), and at its target's row. */
  private readonly atSource: Uint32Array;
  private readonly atTarget: Uint32Array;

  /** @param source - and `target`: ends of each tie, taken over and changed by swaps; repeats and loops are allowed */
  constructor(n: number, source: Uint32Array, target: Uint32Array) {
    const m = source.length;
    this.n = n;
    this.source = source;
    this.target = target;
    this.start = new Uint32Array(n + 1);
    for (let e = 0; e < m; e++) {
      this.start[source[e] + 1]++;
      this.start[target[e] + 1]++;
    }
    for (let i = 0; i < n; i++) this.start[i + 1] += this.start[i];
    const fill = this.start.slice(0, n);
    this.row = new Uint32Array(2 * m);
    this.atSource = new Uint32Array(m);
    this.atTarget = new Uint32Array(m);
    for (let e = 0; e < m; e++) {
      this.atSource[e] = fill[source[e]]++;
      this.row[this.atSource[e]] = target[e];
      this.atTarget[e] = fill[target[e]]++;
      this.row[this.atTarget[e]] = source[e];
    }
  }

  static of(ties: Ties): TieSlots {
    const { source, target } = toPairs(ties);
    return new TieSlots(ties.n, source, target);
  }

  /** How many ties join i and j (i ≠ j); counts at most `limit`. Cost O(smaller degree). */
  joined(i: number, j: number, limit: number): number {
    const { start, row } = this;
    if (start[i + 1] - start[i] > start[j + 1] - start[j]) {
      const held = i;
      i = j;
      j = held;
    }
    let count = 0;
    for (let at = start[i]; at < start[i + 1]; at++) {
      if (row[at] === j && ++count >= limit) return count;
    }
    return count;
  }

  /** Turns tie e around, so that its far end becomes its near end. */
  turn(e: number): void {
    const { source, target, atSource, atTarget } = this;
    const end = source[e];
    source[e] = target[e];
    target[e] = end;
    const at = atSource[e];
    atSource[e] = atTarget[e];
    atTarget[e] = at;
  }

  /** True when a–b and c–d may become a–d and c–b: no loop, no second tie. */
  swappable(e: number, f: number): boolean {
    const a = this.source[e];
    const b = this.target[e];
    const c = this.source[f];
    const d = this.target[f];
    if (a === d || c === b || a === c || b === d) return false;
    return this.joined(a, d, 1) === 0 && this.joined(c, b, 1) === 0;
  }

  /** Exchanges the far ends of ties e and f. Degrees stay; simplicity is the caller's (see `swappable`). Cost O(1). */
  swap(e: number, f: number): void {
    const { source, target, atSource, atTarget, row } = this;
    const b = target[e];
    const d = target[f];
    target[e] = d;
    target[f] = b;
    const held = atTarget[e];
    atTarget[e] = atTarget[f];
    atTarget[f] = held;
    row[atSource[e]] = d;
    row[atTarget[e]] = source[e];
    row[atSource[f]] = b;
    row[atTarget[f]] = source[f];
  }

  /** The ties as compressed rows, with the weights of their numbers. Cost O(n + m). */
  toTies(weight: Float64Array | null): Ties {
    return fromPairs(this.n, this.source, this.target, weight);
  }
}
