/**
 * What the screen knows of a study: one interface over a results folder and over a study run in the page.
 *
 * A source hands out typed columns of one generation of one arm and replicate at a time; it never holds the whole
 * panel. Knows nothing of how things are drawn.
 */
import type { Ties } from '../../network/graph.js';
import type { Model } from '../../sim/model/types.js';

/** An arm as the screen names it. */
export interface ArmInfo {
  readonly name: string;
  /** Measures of the network at generation 0, by indicator name; replicate means. */
  readonly reached: Readonly<Record<string, number>>;
  /** What its households solve. */
  readonly model: Model;
}

/** What holds for the whole study. */
export interface StudyInfo {
  readonly title: string;
  readonly seed: string;
  /** Program version that made the numbers. */
  readonly version: string;
  readonly currency: string;
  readonly yearsPerGeneration: number;
  readonly arms: readonly ArmInfo[];
  /** Replicates that can be shown (panel kept), ascending; `replicates` counts all. */
  readonly shown: readonly number[];
  readonly replicates: number;
  /** Decisions t = 0 … generations − 1; generation `generations` is the last children. */
  readonly generations: number;
  /** The panel holds generations 0, every, 2 every … */
  readonly every: number;
  readonly households: number;
  readonly groupNames: readonly string[];
  /** The study as YAML, every default written out. */
  readonly yaml: string;
}

/** Households of one arm and replicate: labels that do not change; arrays of length n. */
export interface Cast {
  readonly n: number;
  /** Household numbers as the files have them. */
  readonly id: Uint32Array;
  /** Ids of a household file, by household; null when households are drawn and have numbers only. */
  readonly names: readonly string[] | null;
  /** Names of places as in a household file, by place; null when places are numbers. */
  readonly placeNames: readonly string[] | null;
  readonly place: Uint32Array;
  readonly places: number;
  readonly group: Uint32Array;
  readonly groups: number;
  readonly childWeight: Float64Array;
  /** 1 when a change of the study ever acts on the household, or null when the study changes nothing. */
  readonly treated: Uint8Array | null;
}

/** Role of a household in a pocket. */
export const ROLE = { none: 0, fringe: 1, core: 2 } as const;
/** Why a household is frustrated. */
export const CAUSE = { none: 0, local: 1, general: 2 } as const;

/** One generation of one arm and replicate; arrays of length n, in the order of the cast. */
export interface Snapshot {
  readonly generation: number;
  /** False for the last children: only `wealth` holds. */
  readonly decided: boolean;
  readonly wealth: Float64Array;
  /** One column a milestone. */
  readonly aspirations: readonly Float64Array[];
  readonly planned: Float64Array;
  readonly childWealth: Float64Array;
  /** Milestones met by the plan; 0 = frustrated. */
  readonly met: Uint8Array;
  readonly isolated: Uint8Array;
  /** Pocket id, or −1. */
  readonly pocket: Int32Array;
  /** A value of `ROLE`. */
  readonly role: Uint8Array;
  /** A value of `CAUSE`. */
  readonly cause: Uint8Array;
  readonly sheltered: Uint8Array;
  readonly complacent: Uint8Array;
}

/** A table of results, a column per name; text or numbers, NaN or '' where empty. */
export interface Table {
  readonly rows: number;
  readonly columns: Readonly<Record<string, readonly string[] | Float64Array>>;
}

export type TableName =
  | 'indicators'
  | 'contrasts'
  | 'incidence'
  | 'transitions'
  | 'pockets'
  | 'frustration'
  | 'regimes';

/** How far a study run in the page has come. */
export interface Progress {
  /** Share done, 0 … 1. */
  readonly done: number;
  /** What it is doing, in words. */
  readonly doing: string;
  /** Replicates whose generations can be shown so far. */
  readonly shown: readonly number[];
  /** Last generation that can be shown of the first replicate, −1 before any. */
  readonly reached: number;
}

export interface Source {
  readonly kind: 'folder' | 'page';
  readonly info: StudyInfo;
  cast(arm: number, replicate: number): Promise<Cast>;
  /** Ties as the households of that generation see them; the same object while ties do not change. */
  ties(arm: number, replicate: number, generation: number): Promise<Ties>;
  snapshot(arm: number, replicate: number, generation: number): Promise<Snapshot>;
  /**
   * Least and largest wealth by generation, length 2 (generations + 1): min, max, min, max …; NaN where unknown.
   * Cheap: from the footer of a file, not from its rows.
   */
  extents(arm: number, replicate: number): Promise<Float64Array>;
  /** A table of results, or null when the study has none (yet). */
  table(name: TableName): Promise<Table | null>;
  /** Files of the results folder, to save or link to. */
  files(): Promise<readonly string[]>;
  file(name: string): Promise<Uint8Array>;
  close(): void;
}

/** A text column; empty strings when the table lacks it. */
export function text(table: Table, name: string): readonly string[] {
  const c = table.columns[name];
  if (c === undefined) return new Array<string>(table.rows).fill('');
  return c instanceof Float64Array ? Array.from(c, (v) => (Number.isNaN(v) ? '' : String(v))) : c;
}

/** A number column; NaN where empty, and throughout when the table lacks it. */
export function numbers(table: Table, name: string): Float64Array {
  const c = table.columns[name];
  if (c === undefined) return new Float64Array(table.rows).fill(NaN);
  return c instanceof Float64Array ? c : Float64Array.from(c, (v) => (v === '' ? NaN : Number(v)));
}
