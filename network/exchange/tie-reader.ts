/**
 * Gathers ties that a file lists by household id, whatever its format, and packs them into rows.
 *
 * Ids are any text. Either the households are known beforehand (a study's, with isolates) and other ids are refused, or
 * they are numbered as they first appear.
 */
import { nearest } from '../errors.js';
import { fromPairs, type Ties } from '../graph.js';
import { Faults, shown } from './faults.js';

/** Households of a file: their ids in order, or their number when the ids are 0 … n−1. */
export type Ids = readonly string[] | number;

export class TieReader {
  readonly faults = new Faults();
  private readonly place: string;
  private readonly known: boolean;
  private readonly index = new Map<string, number>();
  private readonly ids: string[] = [];
  private source = new Uint32Array(1024);
  private target = new Uint32Array(1024);
  private line = new Uint32Array(1024);
  private weight = new Float64Array(1024);
  private count = 0;

  /** @param ids - households that may have ties, or null to take ids as they come */
  constructor(place: string, ids: Ids | null) {
    this.place = place;
    this.known = ids !== null;
    if (ids === null) return;
    const n = typeof ids === 'number' ? ids : ids.length;
    for (let i = 0; i < n; i++) this.addHousehold(typeof ids === 'number' ? String(i) : ids[i]);
  }

  /** Number of households so far. */
  get households(): number {
    return this.ids.length;
  }

  /** Adds a household; returns its index, or −1 when the id is taken. */
  addHousehold(id: string): number {
    if (this.index.has(id)) return -1;
    this.index.set(id, this.ids.length);
    return this.ids.push(id) - 1;
  }

  /** Index of an id, or −1. */
  indexOf(id: string): number {
    return this.index.get(id) ?? -1;
  }

  /**
   * Adds a tie; a loop or an unknown id becomes a fault.
   * @param weight - NaN where the file gives none
   */
  add(a: string, b: string, weight: number, line: number): void {
    if (a === '' || b === '') {
      this.faults.add('missing-id', this.at(line), 'a tie without a household', 'give source and target an id');
      return;
    }
    const i = this.household(a, line);
    const j = this.household(b, line);
    if (i < 0 || j < 0) return;
    if (i === j) {
      this.faults.add('loop', this.at(line), `${shown(a)} is tied to itself`, 'drop the row');
      return;
    }
    if (this.count === this.source.length) this.grow();
    this.source[this.count] = i;
    this.target[this.count] = j;
    this.line[this.count] = line;
    this.weight[this.count++] = weight;
  }

  /**
   * The ties, once all are in.
   * @param weighted - whether the file has weights
   * @throws InputError for everything that was wrong, second ties (also reversed) included
   */
  finish(weighted: boolean): { ties: Ties; ids: string[] } {
    const n = this.ids.length;
    const source = this.source.subarray(0, this.count);
    const target = this.target.subarray(0, this.count);
    const ties = fromPairs(n, source, target, weighted ? this.weight.subarray(0, this.count) : null);
    let repeated = false;
    for (let i = 0; i < n && !repeated; i++) {
      for (let e = ties.start[i] + 1; e < ties.start[i + 1]; e++) {
        if (ties.target[e] === ties.target[e - 1]) repeated = true;
      }
    }
    if (repeated) this.findRepeats(ties);
    this.faults.check();
    return { ties, ids: this.ids };
  }

  private at(line: number): string {
    return `${this.place}:${line}`;
  }

  private household(id: string, line: number): number {
    const i = this.index.get(id);
    if (i !== undefined) return i;
    if (!this.known) return this.addHousehold(id);
    const close = this.ids.length <= 5000 ? nearest(id, this.ids) : undefined;
    this.faults.add(
      'unknown-id',
      this.at(line),
      `there is no household ${shown(id)}`,
      close === undefined ? 'use the ids of the households' : `did you mean ${shown(close)}?`,
    );
    return -1;
  }

  /** Names every second tie by its line; only the ends that occur twice are looked up. */
  private findRepeats(ties: Ties): void {
    const first = new Map<string, number>();
    const doubled = new Set<string>();
    for (let i = 0; i < ties.n; i++) {
      for (let e = ties.start[i] + 1; e < ties.start[i + 1]; e++) {
        if (ties.target[e] === ties.target[e - 1]) doubled.add(pairKey(i, ties.target[e]));
      }
    }
    for (let e = 0; e < this.count; e++) {
      const key = pairKey(this.source[e], this.target[e]);
      if (!doubled.has(key)) continue;
      const before = first.get(key);
      if (before === undefined) first.set(key, this.line[e]);
      else {
        this.faults.add(
          'duplicate-tie',
          this.at(this.line[e]),
          `the tie of ${shown(this.ids[this.source[e]])} and ${shown(this.ids[this.target[e]])} was given on line ${before} already`,
          'keep one of the two (a tie has no direction)',
        );
      }
    }
  }

  private grow(): void {
    const size = 2 * this.source.length;
    const longer = (old: Uint32Array): Uint32Array<ArrayBuffer> => {
      const more = new Uint32Array(size);
      more.set(old);
      return more;
    };
    this.source = longer(this.source);
    this.target = longer(this.target);
    this.line = longer(this.line);
    const weight = new Float64Array(size);
    weight.set(this.weight);
    this.weight = weight;
  }
}

function pairKey(i: number, j: number): string {
  return i < j ? `${i},${j}` : `${j},${i}`;
}

/** A number as files write it (`1`, `-0.5`, `2e3`), or NaN for anything else, hexadecimal and blanks included. */
export function fileNumber(text: string): number {
  return /^[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$/.test(text) ? Number(text) : NaN;
}

/**
 * A tie's weight, or NaN after adding a fault: empty, not a number, negative, infinite.
 */
export function fileWeight(text: string, place: string, faults: Faults): number {
  const clean = text.trim();
  if (clean === '') {
    faults.add('missing-weight', place, 'the tie has no weight', 'give every tie a weight, or none');
    return NaN;
  }
  const weight = fileNumber(clean);
  if (Number.isNaN(weight) || !Number.isFinite(weight)) {
    faults.add('bad-number', place, `weight ${shown(clean)} is not a number`, 'write it like 0.5');
    return NaN;
  }
  if (weight < 0) {
    faults.add('negative-weight', place, `weight ${clean} is negative`, 'give weights that are 0 or more');
    return NaN;
  }
  return weight;
}
