/**
 * Indicators of a finished study in memory: arm × replicate × generation, a plane per indicator.
 *
 * Small whatever the population: a study of 100 replicates and 20 generations holds 2,000 numbers an indicator and arm.
 */
import type { Coded } from './field.js';
import type { TableData } from './read.js';

export class IndicatorCube {
  readonly arms: readonly string[];
  readonly replicates: number;
  /** T + 1: the last generation measures the final children. */
  readonly generations: number;
  readonly names: readonly string[];
  private readonly planes = new Map<string, Float64Array>();

  private constructor(arms: readonly string[], replicates: number, generations: number, names: readonly string[]) {
    this.arms = arms;
    this.replicates = replicates;
    this.generations = generations;
    this.names = names;
    for (const name of names) this.planes.set(name, new Float64Array(arms.length * replicates * generations).fill(NaN));
  }

  /** A cube without a value yet. @param generations - T + 1 */
  static empty(
    arms: readonly string[],
    replicates: number,
    generations: number,
    names: readonly string[],
  ): IndicatorCube {
    return new IndicatorCube(arms, replicates, generations, names);
  }

  /** @param table - indicators.csv of a results folder */
  static of(table: TableData): IndicatorCube {
    const arm = table.columns['arm'] as Coded;
    const replicate = table.columns['replicate'] as Int32Array;
    const generation = table.columns['generation'] as Int32Array;
    let replicates = 0;
    let generations = 0;
    for (let row = 0; row < table.rows; row++) {
      replicates = Math.max(replicates, replicate[row] + 1);
      generations = Math.max(generations, generation[row] + 1);
    }
    const names = table.names.filter((name) => !['arm', 'replicate', 'generation'].includes(name));
    const cube = new IndicatorCube(arm.names, replicates, generations, names);
    for (const name of names) {
      const column = table.columns[name] as Float64Array | Int32Array;
      const whole = column instanceof Int32Array;
      for (let row = 0; row < table.rows; row++) {
        const value = whole && column[row] < 0 ? NaN : column[row];
        cube.set(name, arm.codes[row], replicate[row], generation[row], value);
      }
    }
    return cube;
  }

  set(name: string, arm: number, replicate: number, generation: number, value: number): void {
    this.planes.get(name)![(arm * this.replicates + replicate) * this.generations + generation] = value;
  }

  has(name: string): boolean {
    return this.planes.has(name);
  }

  /** One value a replicate, NaN where the indicator is missing. */
  over(name: string, arm: number, generation: number): Float64Array {
    const plane = this.planes.get(name);
    const out = new Float64Array(this.replicates).fill(NaN);
    if (plane === undefined) return out;
    for (let r = 0; r < this.replicates; r++)
      out[r] = plane[(arm * this.replicates + r) * this.generations + generation];
    return out;
  }

  /** Mean over the replicates that have a value; NaN when none has. */
  mean(name: string, arm: number, generation: number): number {
    let sum = 0;
    let count = 0;
    for (const x of this.over(name, arm, generation)) {
      if (Number.isNaN(x)) continue;
      sum += x;
      count++;
    }
    return count > 0 ? sum / count : NaN;
  }
}
