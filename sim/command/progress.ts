/**
 * Progress of long work on standard error: a bar on a terminal, plain lines now and then elsewhere.
 */
import { SingleBar } from 'cli-progress';

export interface Progress {
  update(done: number): void;
  stop(): void;
}

/** Seconds as a reader says them. */
export function duration(seconds: number): string {
  if (!Number.isFinite(seconds)) return '?';
  if (seconds < 90) return `${Math.max(1, Math.round(seconds))} s`;
  if (seconds < 5400) return `${Math.round(seconds / 60)} min`;
  return `${(seconds / 3600).toFixed(1)} h`;
}

/** A count with its size in words: 1.2 million. */
export function amount(x: number): string {
  if (x >= 1e6) return `${(x / 1e6).toFixed(x >= 1e8 ? 0 : 1)} million`;
  if (x >= 1e4) return `${Math.round(x / 1e3)} thousand`;
  return String(Math.round(x));
}

/** Bytes as a reader says them. */
export function size(bytes: number): string {
  const units = ['B', 'kB', 'MB', 'GB', 'TB'];
  let u = 0;
  let x = bytes;
  while (x >= 1000 && u < units.length - 1) {
    x /= 1000;
    u++;
  }
  return `${x >= 100 || u === 0 ? x.toFixed(0) : x.toFixed(1)} ${units[u]}`;
}

/**
 * @param total - units of work
 * @param unit - what a unit is, for the rate ("household-generations")
 * @param perUnit - how many of `unit` one unit of work stands for
 * @param quiet - no output at all
 */
export function progress(total: number, unit: string, perUnit: number, quiet: boolean): Progress {
  if (quiet || total === 0) return { update: () => {}, stop: () => {} };
  const began = performance.now();
  let first: number | null = null;
  const state = (done: number): { percent: string; rate: string; left: string } => {
    first ??= done;
    const seconds = (performance.now() - began) / 1000;
    const rate = (done - first) / seconds;
    return {
      percent: `${Math.floor((100 * done) / total)} %`,
      rate: rate > 0 ? `${amount(rate * perUnit)} ${unit} a second` : '',
      left: rate > 0 ? `${duration((total - done) / rate)} left` : '',
    };
  };
  if (process.stderr.isTTY) {
    const bar = new SingleBar({
      format: '{bar} {share}  {rate}  {left}',
      stream: process.stderr,
      barCompleteChar: '█',
      barIncompleteChar: '·',
      barsize: 24,
      hideCursor: true,
      clearOnComplete: true,
      linewrap: false,
      gracefulExit: false,
    });
    bar.start(total, 0, { share: '0 %', rate: '', left: '' });
    return {
      update: (done) => {
        const { percent, rate, left } = state(done);
        bar.update(done, { share: percent, rate, left });
      },
      stop: () => bar.stop(),
    };
  }
  let nextLine = 2;
  return {
    update: (done) => {
      const seconds = (performance.now() - began) / 1000;
      const { percent, rate, left } = state(done);
      if (seconds < nextLine || done >= total) return;
      nextLine = Math.max(seconds + 2, seconds * 1.5);
      console.error([percent, rate, left].filter((part) => part !== '').join(', '));
    },
    stop: () => {},
  };
}

/** A count with its noun: `1 arm`, `2 arms`. */
export function counted(n: number, noun: string): string {
  return `${n} ${noun}${n === 1 ? '' : 's'}`;
}
