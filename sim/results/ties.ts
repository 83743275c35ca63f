/**
 * Ties over time as intervals: the first and the last generation in which each tie stands.
 *
 * Follows the graph from generation to generation and holds only what stands and what has ended. A tie whose
 * weight changes ends and starts anew with the other weight.
 */
import { type Ties, toPairs } from '../../network/graph.js';

/** Ties with their intervals, both ends included, ordered by source, target, first generation. */
export interface TieIntervals {
  readonly source: Uint32Array;
  readonly target: Uint32Array;
  /** Null when all ties weigh 1. */
  readonly weight: Float64Array | null;
  readonly from: Uint32Array;
  readonly to: Uint32Array;
}

interface Ended {
  source: number;
  target: number;
  weight: number;
  from: number;
  to: number;
}

/**
 * Gathers intervals.
 *
 * @example
 * const spans = new TieSpans();
 * spans.see(0, before); spans.see(1, before); spans.see(2, after);
 * spans.intervals(2);
 */
export class TieSpans {
  #source: Uint32Array = new Uint32Array(0);
  #target: Uint32Array = new Uint32Array(0);
  #weight: Float64Array | null = null;
  #from: Uint32Array = new Uint32Array(0);
  #ended: Ended[] = [];
  #seen = false;

  /**
   * The graph of one generation; call for every generation in which it differs from the one before, in order.
   * Cost O(ties).
   */
  see(generation: number, ties: Ties): void {
    const { source, target, weight } = toPairs(ties);
    const from = new Uint32Array(source.length).fill(generation);
    if (this.#seen) this.#end(generation, source, target, weight, from);
    this.#seen = true;
    this.#source = source;
    this.#target = target;
    this.#weight = weight;
    this.#from = from;
  }

  /** Both lists are sorted by source and target: one pass tells what stands on, what ended and what is new. */
  #end(
    generation: number,
    source: Uint32Array,
    target: Uint32Array,
    weight: Float64Array | null,
    from: Uint32Array,
  ): void {
    let now = 0;
    for (let was = 0; was < this.#source.length; was++) {
      const s = this.#source[was];
      const t = this.#target[was];
      const w = this.#weight === null ? 1 : this.#weight[was];
      while (now < source.length && (source[now] < s || (source[now] === s && target[now] < t))) now++;
      const stands = now < source.length && source[now] === s && target[now] === t;
      if (stands && (weight === null ? 1 : weight[now]) === w) from[now] = this.#from[was];
      else this.#ended.push({ source: s, target: t, weight: w, from: this.#from[was], to: generation - 1 });
    }
  }

  /**
   * All intervals when `last` is the last generation, closing those that stand. Cost O(k log k) for k intervals.
   */
  intervals(last: number): TieIntervals {
    const m = this.#source.length;
    if (this.#ended.length === 0) {
      const to = new Uint32Array(m).fill(last);
      return { source: this.#source, target: this.#target, weight: this.#weight, from: this.#from, to };
    }
    const all = [...this.#ended];
    for (let e = 0; e < m; e++) {
      const weight = this.#weight === null ? 1 : this.#weight[e];
      all.push({ source: this.#source[e], target: this.#target[e], weight, from: this.#from[e], to: last });
    }
    all.sort((a, b) => a.source - b.source || a.target - b.target || a.from - b.from);
    return {
      source: Uint32Array.from(all, (tie) => tie.source),
      target: Uint32Array.from(all, (tie) => tie.target),
      weight: all.every((tie) => tie.weight === 1) ? null : Float64Array.from(all, (tie) => tie.weight),
      from: Uint32Array.from(all, (tie) => tie.from),
      to: Uint32Array.from(all, (tie) => tie.to),
    };
  }
}
