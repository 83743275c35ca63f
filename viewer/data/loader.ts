/**
 * Loads what a view needs from a source and keeps the last of it, within a bound on memory.
 */
import type { Ties } from '../../network/graph.js';
import type { Cast, Snapshot, Source } from './source.js';

const LIMIT_BYTES = 320e6;

/** Approximate bytes of a snapshot. */
function weigh(s: Snapshot): number {
  return s.wealth.length * (8 * (3 + s.aspirations.length) + 4 + 6);
}

export class Loader {
  readonly source: Source;
  #snapshots = new Map<string, { value: Promise<Snapshot>; bytes: number }>();
  #bytes = 0;
  #casts = new Map<string, Promise<Cast>>();
  #ties = new Map<string, Promise<Ties>>();
  #extents = new Map<string, Promise<Float64Array>>();

  constructor(source: Source) {
    this.source = source;
  }

  /** Bytes of generations kept. */
  get held(): number {
    return this.#bytes;
  }

  snapshot(arm: number, replicate: number, generation: number): Promise<Snapshot> {
    const key = `${arm}/${replicate}/${generation}`;
    const kept = this.#snapshots.get(key);
    if (kept !== undefined) {
      // most recently used last
      this.#snapshots.delete(key);
      this.#snapshots.set(key, kept);
      return kept.value;
    }
    const entry = { value: this.source.snapshot(arm, replicate, generation), bytes: 0 };
    this.#snapshots.set(key, entry);
    entry.value.then(
      (s) => {
        entry.bytes = weigh(s);
        this.#bytes += entry.bytes;
        for (const [k, old] of this.#snapshots) {
          if (this.#bytes <= LIMIT_BYTES || k === key) break;
          this.#bytes -= old.bytes;
          this.#snapshots.delete(k);
        }
      },
      () => this.#snapshots.delete(key),
    );
    return entry.value;
  }

  cast(arm: number, replicate: number): Promise<Cast> {
    return once(this.#casts, `${arm}/${replicate}`, () => this.source.cast(arm, replicate));
  }

  ties(arm: number, replicate: number, generation: number): Promise<Ties> {
    return once(
      this.#ties,
      `${arm}/${replicate}/${generation}`,
      () => this.source.ties(arm, replicate, generation),
      24,
    );
  }

  extents(arm: number, replicate: number): Promise<Float64Array> {
    return once(this.#extents, `${arm}/${replicate}`, () => this.source.extents(arm, replicate));
  }
}

function once<T>(map: Map<string, Promise<T>>, key: string, make: () => Promise<T>, most = 64): Promise<T> {
  let kept = map.get(key);
  if (kept === undefined) {
    kept = make();
    map.set(key, kept);
    kept.catch(() => map.delete(key));
    if (map.size > most) map.delete(map.keys().next().value as string);
  }
  return kept;
}
