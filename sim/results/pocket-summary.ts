/**
 * The pockets of an arm over all replicates: how many are more than chance, where, how large, how long they live, why.
 *
 * A pocket is counted once over its life; it is beyond chance when it is so in at least one generation of it.
 */

/** A row of `pockets.csv` as far as it is needed here. */
export interface PocketStepRow {
  readonly replicate: number;
  readonly generation: number;
  readonly pocket: number;
  /** Core households; 0 in the row of its end. */
  readonly size: number;
  readonly places: number;
  /** NaN when it was not tested. */
  readonly pValue: number;
  readonly local: number;
  readonly general: number;
}

export interface PocketSummary {
  /** Over all replicates. */
  readonly pockets: number;
  readonly significant: number;
  /** False when no pocket has a p-value. */
  readonly tested: boolean;
  readonly significantPerReplicate: number;
  /** Of those beyond chance, from here on. First generation of any; the generation with most of them. */
  readonly firstGeneration: number;
  readonly peakGeneration: number;
  /** Median over pocket-generations. */
  readonly medianSize: number;
  readonly medianPlaces: number;
  /** Mean generations a pocket lasts; the end of the horizon cuts lives short. */
  readonly meanLife: number;
  /** Of their core members, the share with a local cause. */
  readonly localShare: number;
}

/** Level at which a pocket counts as more than chance. */
const LEVEL = 0.05;

export function pocketSummary(rows: readonly PocketStepRow[], replicates: number): PocketSummary {
  const lives = new Map<string, PocketStepRow[]>();
  for (const row of rows) {
    if (row.size === 0) continue;
    const id = `${row.replicate} ${row.pocket}`;
    const life = lives.get(id);
    if (life === undefined) lives.set(id, [row]);
    else life.push(row);
  }
  const beyond = [...lives.values()].filter((life) => life.some((row) => row.pValue <= LEVEL));
  const steps = beyond.flat();
  const byGeneration = new Map<number, number>();
  for (const row of steps) byGeneration.set(row.generation, (byGeneration.get(row.generation) ?? 0) + 1);
  const peak = [...byGeneration].sort((a, b) => b[1] - a[1] || a[0] - b[0])[0];
  const sum = (of: (row: PocketStepRow) => number): number => steps.reduce((total, row) => total + of(row), 0);
  const caused = sum((row) => row.local + row.general);
  return {
    pockets: lives.size,
    significant: beyond.length,
    tested: rows.some((row) => !Number.isNaN(row.pValue)),
    significantPerReplicate: beyond.length / replicates,
    firstGeneration: Math.min(...steps.map((row) => row.generation)),
    peakGeneration: peak?.[0] ?? NaN,
    medianSize: median(steps.map((row) => row.size)),
    medianPlaces: median(steps.map((row) => row.places)),
    meanLife: steps.length / beyond.length,
    localShare: caused > 0 ? sum((row) => row.local) / caused : NaN,
  };
}

function median(values: readonly number[]): number {
  const sorted = [...values].sort((a, b) => a - b);
  const middle = Math.floor(sorted.length / 2);
  if (sorted.length === 0) return NaN;
  return sorted.length % 2 === 1 ? sorted[middle]! : (sorted[middle - 1]! + sorted[middle]!) / 2;
}
