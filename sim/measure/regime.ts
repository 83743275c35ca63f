/**
 * Regimes: what an arm has come to by the last third of its horizon, with the evidence.
 *
 * A rule of thumb over a few series, not a proof: it looks at the spread of log wealth, its level, its whole profile
 * and frustration, and says `undecided` rather than guess. Whether a movement goes on or dies down is judged by how its
 * steps change from the first to the second half of the window, carried on at that rate for ever. Thresholds are
 * constants below.
 */
import { log, pow } from '../../network/elementary.js';
import type { IndicatorContext } from './indicators.js';
import { line } from './mobility.js';
import { quantileOfSorted } from './quantile.js';

/** Verdicts, as `regimes.csv` writes them. */
export const REGIMES = [
  'converging',
  'widening',
  'settled, one mode',
  'settled, two or more modes',
  'settled',
  'declining',
  'cycling',
  'undecided',
] as const;
export type Regime = (typeof REGIMES)[number];

/** What one generation adds to the series. */
export interface RegimeObservation {
  /** Standard deviation of log wealth. */
  readonly sdLog: number;
  /** Quantiles of log wealth at 0.05, 0.1, … 0.95, length 19. */
  readonly profile: ArrayLike<number>;
  /** Modes that stand out of the log-wealth density. */
  readonly modes: number;
  /** Share frustrated; NaN for the final children. */
  readonly shareFrustrated: number;
  /** Mean wealth of the children over mean wealth; NaN for the final children. */
  readonly meanGrowth: number;
}

/** A verdict with its evidence: the columns of `regimes.csv`. Numbers that do not apply are NaN. */
export interface RegimeVerdict {
  readonly regime: Regime;
  /** First generation of the window looked at; its last is the final one. */
  readonly from: number;
  readonly to: number;
  /** Spread of log wealth at both ends of the window. */
  readonly sdLogFrom: number;
  readonly sdLogTo: number;
  /** Slope of the spread over the window, per generation, relative to its mean. */
  readonly spreadTrend: number;
  /** Change of the median of log wealth over the window, per generation. */
  readonly levelTrend: number;
  /** Mean gross growth of mean wealth over the window. */
  readonly meanGrowth: number;
  /** Mean share frustrated over the window. */
  readonly shareFrustrated: number;
  /** Most common number of modes in the window. */
  readonly modes: number;
  /** Generations after which the distribution returns to itself; NaN unless cycling. */
  readonly period: number;
  /** Mean distance between profiles one period apart (cycling) or one generation apart, in log wealth. */
  readonly distance: number;
  /** Undecided: about how many more generations would tell. NaN otherwise. */
  readonly moreGenerations: number;
}

/** Probabilities of the profile. */
export const PROFILE_AT = Float64Array.from({ length: 19 }, (_, k) => (k + 1) / 20);

/** Fewest generations a verdict rests on. */
const SHORTEST = 4;
/** A spread or level that changes by less than this a generation stands still (relative, or in log points). */
const STILL = 0.01;
/** Scatter around a straight line, and drift over the window, relative to the level, that luck may account for. */
const LUCK = 0.05;
/** Roughness, relative to the level, from which steps are noisy. */
const NOISE = 0.01;
/** Fewest generations from which a noisy movement can be carried on. */
const NOISY_SHORTEST = 7;
/** Standard errors by which a noisy trend must stand out to be carried on. */
const CLEAR = 4;
/** A spread has all but gone when this share of it is left, of the start's, or of today's once the fall has run out. */
const LEFT_OVER = 0.05;
/** A rise goes on when at least this much of today's spread is still to come. */
const RISE = 1;
/** Spread of log wealth below which everybody is equal. */
const EQUAL = 1e-3;
/** Growth is steady when its steps shrink by no more than this factor a generation. */
const STEADY = 0.9;
/** Generations in a window that shows a round of up to eight generations returning twice. */
const LONG = 10;
/** Share frustrated from which everyone is. */
const EVERYONE = 0.999;
/** Profiles that come this close, relative to how far they go, have returned. */
const RETURNED = 0.15;
/** How far, in log wealth, a cycle must go to be one. */
const SWING = 0.05;
/** Share of the window in which the modes must agree. */
const MOSTLY = 2 / 3;

/**
 * One generation's observation, from the context of its indicators.
 *
 * @param decision - share frustrated and mean growth of the generation, or null for the final children
 */
export function observeRegime(
  context: IndicatorContext,
  decision: { readonly shareFrustrated: number; readonly meanGrowth: number } | null,
): RegimeObservation {
  const { sortedLog, sdLog, modes } = context;
  return {
    sdLog,
    profile: Float64Array.from(PROFILE_AT, (p) => quantileOfSorted(sortedLog.value, p)),
    modes,
    shareFrustrated: decision?.shareFrustrated ?? NaN,
    meanGrowth: decision?.meanGrowth ?? NaN,
  };
}

/**
 * Classes an arm of one replicate.
 *
 * @param series - observations of generations 0 … T, in order
 * @returns the verdict. Cost O(window²).
 */
export function classifyRegime(series: readonly RegimeObservation[]): RegimeVerdict {
  const last = series.length - 1;
  const from = Math.max(0, Math.min(Math.ceil((2 * last) / 3), last - SHORTEST + 1));
  const window = series.slice(from);
  const spread = window.map((o) => o.sdLog);
  const level = window.map((o) => o.profile[9]);
  const decided = window.filter((o) => !Number.isNaN(o.meanGrowth));
  const spreadLine = trendOf(spread);
  const meanSpread = average(spread);
  const { common, agreed } = commonModes(window);
  const evidence = {
    from,
    to: last,
    sdLogFrom: spread[0],
    sdLogTo: spread[spread.length - 1],
    spreadTrend: meanSpread > 0 ? spreadLine.slope / meanSpread : 0,
    levelTrend: trendOf(level).slope,
    meanGrowth: average(decided.map((o) => o.meanGrowth)),
    shareFrustrated: average(decided.map((o) => o.shareFrustrated)),
    modes: common,
    period: NaN,
    distance: average(window.slice(1).map((o, k) => distance(window[k], o))),
    moreGenerations: NaN,
  };
  const verdict = (regime: Regime, more: Partial<RegimeVerdict> = {}): RegimeVerdict => ({
    regime,
    ...evidence,
    ...more,
  });

  if (window.length < SHORTEST) {
    return verdict('undecided', { moreGenerations: SHORTEST - window.length });
  }
  const cycle = cycleOf(window);
  if (cycle !== null) return verdict('cycling', { period: cycle.period, distance: cycle.distance });
  if (isDeclining(decided)) return verdict('declining');
  if (Math.max(...spread) < EQUAL) {
    // equals who neither stand still nor grow steadily may be on a round too long for the window to see
    const pace = paceOf(level);
    const steady = Math.abs(pace.step) <= STILL || pace.ratio >= STEADY;
    if (steady || window.length >= LONG) return verdict('converging');
    return verdict('undecided', { moreGenerations: Math.max(1, 3 * LONG - last) });
  }

  const drift = Math.abs(spreadLine.slope);
  const stands =
    drift <= STILL * meanSpread ||
    (drift <= 2 * spreadLine.se &&
      drift * (window.length - 1) <= LUCK * meanSpread &&
      spreadLine.scatter <= LUCK * meanSpread);
  if (stands) {
    // everyone may still be growing together: then the spread has settled, the distribution has not
    if (Math.abs(evidence.levelTrend) > STILL || !agreed) return verdict('settled');
    return verdict(common >= 2 ? 'settled, two or more modes' : 'settled, one mode');
  }
  // steps of a few noisy generations say nothing of how a movement goes on
  const path = spreadLine.slope < 0 ? spread.map(log) : spread.map((s) => s / meanSpread);
  const noisy = roughness(path) > NOISE;
  if (noisy && (window.length < NOISY_SHORTEST || Math.abs(spreadLine.slope) <= CLEAR * spreadLine.se)) {
    const wanted = Math.ceil(1.5 * Math.max(NOISY_SHORTEST, window.length + 2));
    return verdict('undecided', { moreGenerations: Math.max(1, wanted - last) });
  }
  if (spreadLine.slope < 0) {
    // toward 0: in logs, where a fall at a steady rate has equal steps
    const pace = paceOf(spread.map(log));
    const nearlyThere = evidence.sdLogTo <= LEFT_OVER * series[0].sdLog;
    if (nearlyThere || pace.toCome <= log(LEFT_OVER)) return verdict('converging');
    return verdict('undecided', { moreGenerations: generationsUntilStill(pace, STILL, last) });
  }
  const pace = paceOf(spread);
  if (pace.toCome >= RISE * evidence.sdLogTo) return verdict('widening');
  return verdict('undecided', { moreGenerations: generationsUntilStill(pace, STILL * evidence.sdLogTo, last) });
}

/** Least-squares trend over generations: slope, its standard error, and scatter around the line. */
function trendOf(values: readonly number[]): { slope: number; se: number; scatter: number } {
  const { slope, se, intercept } = line(
    values.map((_, k) => k),
    values,
  );
  let squares = 0;
  for (let k = 0; k < values.length; k++) {
    const residual = values[k] - intercept - slope * k;
    squares += residual * residual;
  }
  return { slope, se, scatter: Math.sqrt(squares / values.length) };
}

/** Standard deviation of the noise on a smooth path, from its third differences (white noise: their variance is 20 σ²). */
function roughness(path: readonly number[]): number {
  let squares = 0;
  for (let k = 3; k < path.length; k++) {
    const third = path[k] - 3 * path[k - 1] + 3 * path[k - 2] - path[k - 3];
    squares += third * third;
  }
  return Math.sqrt(squares / (path.length - 3) / 20);
}

/** How the steps of a series develop. */
interface Pace {
  /** Mean step a generation in the last half. */
  readonly step: number;
  /** Factor by which the step changes each generation; NaN when its sign changes. */
  readonly ratio: number;
  /** What is still to come if steps keep changing by that factor; infinite when they do not shrink. */
  readonly toCome: number;
}

function paceOf(values: readonly number[]): Pace {
  const steps = values.length - 1;
  const half = Math.floor(steps / 2);
  const first = (values[half] - values[0]) / half;
  const step = (values[steps] - values[steps - half]) / half;
  const ratio = first * step > 0 ? pow(step / first, 1 / (steps - half)) : NaN;
  const toCome = Number.isNaN(ratio) ? 0 : ratio < 1 ? (step * ratio) / (1 - ratio) : step * Infinity;
  return { step, ratio, toCome };
}

/** Generations until the last third of the horizon holds only steps below `still`, from horizon `last`. */
function generationsUntilStill({ step, ratio }: Pace, still: number, last: number): number {
  let t = last;
  if (ratio < 1) for (let s = Math.abs(step); s > still && t < 1000; t++) s *= ratio;
  return Math.ceil(1.5 * t) - last;
}

/** Everyone frustrated throughout, mean growth below 1 throughout, and not on the way to 1. */
function isDeclining(decided: readonly RegimeObservation[]): boolean {
  if (decided.length < 2) return false;
  if (!decided.every((o) => o.shareFrustrated >= EVERYONE && o.meanGrowth < 1)) return false;
  const middle = Math.ceil(decided.length / 2);
  const first = average(decided.slice(0, middle).map((o) => 1 - o.meanGrowth));
  const second = average(decided.slice(middle).map((o) => 1 - o.meanGrowth));
  return second >= 0.5 * first;
}

/** Smallest period of more than one generation after which profiles return, or null. */
function cycleOf(window: readonly RegimeObservation[]): { period: number; distance: number } | null {
  let swing = 0;
  for (let a = 0; a < window.length; a++) {
    for (let b = a + 1; b < window.length; b++) swing = Math.max(swing, distance(window[a], window[b]));
  }
  if (swing < SWING) return null;
  const step = average(window.slice(1).map((o, k) => distance(window[k], o)));
  // two returns at least, and the moves between generations must dwarf the misses
  for (let period = 2; period <= window.length - 2; period++) {
    let worst = 0;
    let sum = 0;
    for (let k = 0; k + period < window.length; k++) {
      const d = distance(window[k], window[k + period]);
      worst = Math.max(worst, d);
      sum += d;
    }
    if (worst <= RETURNED * swing && worst <= 0.5 * step) return { period, distance: sum / (window.length - period) };
  }
  return null;
}

/** Mean absolute difference of two profiles, in log wealth. */
function distance(a: RegimeObservation, b: RegimeObservation): number {
  let sum = 0;
  for (let k = 0; k < a.profile.length; k++) sum += Math.abs(a.profile[k] - b.profile[k]);
  return sum / a.profile.length;
}

/** The most common number of modes, and whether the window mostly agrees on one mode or on more. */
function commonModes(window: readonly RegimeObservation[]): { common: number; agreed: boolean } {
  const counts = new Map<number, number>();
  for (const { modes } of window) counts.set(modes, (counts.get(modes) ?? 0) + 1);
  let common = 1;
  let most = 0;
  for (const [modes, count] of [...counts].sort((a, b) => a[0] - b[0])) {
    if (count > most) {
      common = modes;
      most = count;
    }
  }
  const several = window.filter((o) => o.modes >= 2).length / window.length;
  return { common, agreed: several >= MOSTLY || several <= 1 - MOSTLY };
}

function average(values: readonly number[]): number {
  let sum = 0;
  for (const v of values) sum += v;
  return sum / values.length;
}
