/**
 * A growing list of household pairs: what every builder fills before the ties are packed into rows.
 *
 * Typed arrays that double when full, so that ten million ties cost 8 bytes an end and no objects.
 */
import { fromPairs, type Ties } from '../graph.js';

export class PairList {
  private source: Uint32Array;
  private target: Uint32Array;
  private filled = 0;

  /** @param expected - ties expected; room for a little more is taken at once */
  constructor(expected: number) {
    const room = Math.max(16, Math.ceil(expected * 1.05) + 64);
    this.source = new Uint32Array(room);
    this.target = new Uint32Array(room);
  }

  /** Pairs so far. */
  get length(): number {
    return this.filled;
  }

  /** Adds a pair in either order. Amortised O(1). */
  push(i: number, j: number): void {
    if (this.filled === this.source.length) {
      const source = new Uint32Array(2 * this.filled);
      const target = new Uint32Array(2 * this.filled);
      source.set(this.source);
      target.set(this.target);
      this.source = source;
      this.target = target;
    }
    this.source[this.filled] = i;
    this.target[this.filled++] = j;
  }

  /** The two ends of each pair, without the spare room. */
  ends(): { source: Uint32Array; target: Uint32Array } {
    return { source: this.source.subarray(0, this.filled), target: this.target.subarray(0, this.filled) };
  }

  /** Ties of n households; the pairs must be simple already. Cost O(n + m). */
  toTies(n: number): Ties {
    const { source, target } = this.ends();
    return fromPairs(n, source, target, null);
  }

  /** Ties of n households with loops and repeated pairs left out. Cost O(n + m). */
  toSimpleTies(n: number): Ties {
    const { source, target } = this.ends();
    const multi = fromPairs(n, source, target, null);
    const start = new Uint32Array(n + 1);
    const kept = new Uint32Array(multi.target.length);
    let at = 0;
    for (let i = 0; i < n; i++) {
      let last = i;
      let seen = false;
      for (let e = multi.start[i]; e < multi.start[i + 1]; e++) {
        const j = multi.target[e];
        if (j === i || (seen && j === last)) continue;
        kept[at++] = j;
        last = j;
        seen = true;
      }
      start[i + 1] = at;
    }
    return { n, start, target: kept.slice(0, at), weight: null };
  }
}
