/**
 * How fast a run goes and how long it still takes, in words.
 *
 * Pure but for the clock it is handed: the rate is that of the last few seconds, so that it follows a run that
 * slows down.
 */

/** Milliseconds the rate looks back. */
const WINDOW = 6000;

export class Pace {
  readonly #total: number;
  readonly #seen: { readonly at: number; readonly done: number }[] = [];

  /** @param total - household-generations of the whole run */
  constructor(total: number) {
    this.#total = total;
  }

  /** @param done - household-generations so far; `at` in milliseconds, not falling */
  see(done: number, at: number): void {
    this.#seen.push({ at, done });
    while (this.#seen.length > 2 && at - this.#seen[1]!.at > WINDOW) this.#seen.shift();
  }

  /** Household-generations a second; NaN before two sights. */
  get rate(): number {
    const first = this.#seen[0];
    const last = this.#seen.at(-1);
    if (first === undefined || last === undefined || last.at - first.at < 200) return NaN;
    return (1000 * (last.done - first.done)) / (last.at - first.at);
  }

  /** Seconds to go; NaN while nothing tells. */
  get left(): number {
    const { rate } = this;
    const done = this.#seen.at(-1)?.done ?? 0;
    return rate > 0 ? (this.#total - done) / rate : NaN;
  }

  /** Two short lines: time left, and the rate. */
  words(): string {
    const { rate, left } = this;
    if (Number.isNaN(rate) || Number.isNaN(left)) return 'starting';
    return `${timeWords(left)} left\n${rateWords(rate)} household-generations/s`;
  }
}

/** A duration in words: `24 s`, `3 min`, `2 h 10 min`. */
export function timeWords(seconds: number): string {
  if (seconds < 90) return `${Math.max(1, Math.round(seconds))} s`;
  const minutes = Math.round(seconds / 60);
  return minutes < 90 ? `${minutes} min` : `${Math.floor(minutes / 60)} h ${minutes % 60} min`;
}

function rateWords(rate: number): string {
  if (rate >= 1e6) return `${(rate / 1e6).toFixed(1)} million`;
  if (rate >= 1000) return `${Math.round(rate / 1000)}\u202f000`;
  return String(Math.max(1, Math.round(rate)));
}
