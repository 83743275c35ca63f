/**
 * Layouts of the arms shown: sideways places of the ladder at once, maps in a worker when they are asked for; kept.
 */
import { ladder } from '../../network/arrange/ladder.js';
import type { Ties } from '../../network/graph.js';
import type { Cast } from '../data/source.js';
import { percent } from '../screen/words.js';
import type { MapReply, MapRequest } from './map.worker.js';

export interface MapLayout {
  /** x, y by household, any unit. */
  readonly positions: Float32Array;
  readonly drawn: number;
  readonly tied: number;
  /** Drawn against true same-label share, in words. */
  readonly print: string;
}

export class Layouts {
  readonly #arrived: () => void;
  readonly #sideways = new Map<string, Float32Array>();
  readonly #maps = new Map<string, MapLayout | null>();
  readonly #versions = new WeakMap<Ties, number>();
  #count = 0;
  #worker: Worker | null = null;

  /** @param arrived - called when a map that was asked for is there */
  constructor(arrived: () => void) {
    this.#arrived = arrived;
  }

  clear(): void {
    this.#sideways.clear();
    this.#maps.clear();
    this.#worker?.terminate();
    this.#worker = null;
  }

  sideways(key: string, ties: Ties, cast: Cast, wealth: Float64Array): Float32Array {
    let kept = this.#sideways.get(key);
    if (kept === undefined) {
      kept = ladder(ties, { n: cast.n, place: cast.place, group: cast.group, wealth }).sideways;
      this.#sideways.set(key, kept);
    }
    return kept;
  }

  /** The map, or null while it is computed. The same ties keep the same map; changed ties get their own. */
  map(arm: string, ties: Ties, cast: Cast): MapLayout | null {
    let version = this.#versions.get(ties);
    if (version === undefined) this.#versions.set(ties, (version = ++this.#count));
    const key = `${arm}/${version}`;
    const kept = this.#maps.get(key);
    if (kept !== undefined) return kept;
    this.#maps.set(key, null);
    this.#worker ??= this.#start();
    const byGroup = cast.groups > 1;
    const request: MapRequest = { key, ties, labels: byGroup ? cast.group : cast.place, seed: 'map' };
    this.#labels.set(key, byGroup ? 'group' : 'place');
    this.#worker.postMessage(request);
    return null;
  }

  readonly #labels = new Map<string, string>();

  #start(): Worker {
    const worker = new Worker(new URL('./map.worker.ts', import.meta.url), { type: 'module' });
    worker.onmessage = (event: MessageEvent<MapReply>) => {
      const { key, positions, drawn, tied } = event.data;
      const label = this.#labels.get(key) ?? 'group';
      this.#maps.set(key, {
        positions,
        drawn,
        tied,
        print: `same ${label}: ${percent(drawn)} of the nearest drawn, ${percent(tied)} of ties`,
      });
      this.#arrived();
    };
    return worker;
  }
}
