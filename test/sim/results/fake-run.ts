/**
 * A made-up run for tests of the tables: columns of seeded random numbers with the awkward values files must survive.
 * Nothing here is a solution of the model.
 */
import seedrandom from 'seedrandom';
import { fromPairs, type Ties } from '../../../network/graph.js';
import type { Generation, Model } from '../../../sim/model/types.js';
import type { Extras } from '../../../sim/results/columns.js';
import type { Facts } from '../../../sim/results/facts.js';
import type { Row } from '../../../sim/results/field.js';
import type { PartWriter } from '../../../sim/results/parts.js';
import type { ArmRecord, GenerationRecord } from '../../../sim/study/record.js';

export interface FakeRun {
  readonly n: number;
  readonly generations: number;
  readonly arms: readonly string[];
  readonly replicates: number;
  readonly tiesChange?: boolean;
  /** Counted numbers and no ties, for tests that need many rows. */
  readonly plain?: boolean;
}

export const FACTS: Facts = {
  milestones: 2,
  currency: 'thousand pesos',
  extras: ['pocket', 'pocket_role'],
  covariates: [
    { name: 'x_age', type: 'number' },
    { name: 'x_language', type: 'text' },
  ],
  placeNames: true,
  betweenness: true,
  indicators: [
    { name: 'gini', meaning: 'Gini index of wealth.', formula: 'Σ|y_i − y_j|/(2N²ȳ)', source: '', unit: '' },
    { name: 'modes', meaning: 'Modes.', formula: 'count', source: 'Silverman 1981', unit: '', type: 'integer' },
  ],
  evidence: [{ name: 'slope', meaning: 'Slope of spread.', formula: 'least squares', source: '', unit: '' }],
};

/** Doubles that lose something in careless hands. */
export const AWKWARD = [-0, 0, 1e300, -1e300, 5e-324, 2.2250738585072014e-308, 0.1, 1 / 3, 1e21, 123456789012345680000];

const MODEL: Model = {
  technology: { kind: 'linear', grossReturn: 2 },
  shock: { sdLog: 0, sharedByPlace: 0, risk: 'planned' },
  preferences: [],
  milestones: [],
  persistence: 0,
};

const PLACE_NAMES = ['Oak "Hill", north', 'Mill\nbridge', 'Ford'];

/** About so many ties a household; the last household has none. */
function randomTies(n: number, random: () => number, perHousehold: number): Ties {
  const pairs = new Set<number>();
  for (let e = 0; e < perHousehold * n; e++) {
    const a = Math.floor(random() * (n - 1));
    const b = Math.floor(random() * (n - 1));
    if (a !== b) pairs.add(Math.min(a, b) * n + Math.max(a, b));
  }
  const ends = [...pairs];
  const source = Uint32Array.from(ends, (pair) => Math.floor(pair / n));
  const target = Uint32Array.from(ends, (pair) => pair % n);
  return fromPairs(n, source, target, null);
}

/** Hands one arm of one replicate to a listener, the same every time. */
export function playArm(
  run: FakeRun,
  armIndex: number,
  replicate: number,
  on: {
    starts(record: ArmRecord): void;
    generation(record: GenerationRecord, extras: Extras): void;
    ends(): void;
  },
): void {
  const random = seedrandom(`arm ${armIndex} replicate ${replicate}`);
  const { n, generations } = run;
  const number = (): number => {
    const r = random();
    return r < 0.1 ? AWKWARD[Math.floor(random() * AWKWARD.length)] : r < 0.2 ? 1 : Math.exp(10 * r);
  };
  const plain = run.plain === true;
  const counted = Float64Array.from({ length: n }, (_, i) => i + 1);
  const numbers = (): Float64Array => (plain ? counted : Float64Array.from({ length: n }, number));
  const bytes = (k: number): Uint8Array => Uint8Array.from({ length: n }, (_, i) => (plain ? i % k : random() * k));
  const place = Uint32Array.from({ length: n }, (_, i) => i % 3);
  const group = Uint32Array.from({ length: n }, (_, i) => (i % 5 === 0 ? 1 : 0));
  let ties = randomTies(n, random, plain ? 0 : 2);
  on.starts({
    arm: run.arms[armIndex],
    armIndex,
    replicate,
    generations,
    households: { n, place, places: 3, group, groups: 2, childWeight: numbers() },
    labels: { n, place, group, wealth: numbers() },
    groupNames: ['lowland', 'ไทย, "up"'],
    placeNames: PLACE_NAMES,
    householdIds: null,
    covariates: [
      { name: 'x_age', values: Float64Array.from({ length: n }, (_, i) => (i % 4 === 0 ? Number.NaN : 20 + i)) },
      { name: 'x_language', values: Array.from({ length: n }, (_, i) => (i % 3 === 0 ? null : `tongue ${i % 2}`)) },
    ],
    treated: armIndex === 1 ? bytes(2) : null,
    model: MODEL,
    ties,
    network: { kind: 'random', asked: {}, reached: {} },
  });
  const columns: Generation = {
    wealth: new Float64Array(n),
    aspirations: [new Float64Array(n), new Float64Array(n)].slice(0, armIndex === 0 ? 1 : 2),
    investment: new Float64Array(n),
    consumption: new Float64Array(n),
    planned: new Float64Array(n),
    shock: new Float64Array(n),
    childWealth: new Float64Array(n),
    met: new Uint8Array(n),
    reached: new Uint8Array(n),
    isolated: new Uint8Array(n),
  };
  for (let t = 0; t <= generations; t++) {
    for (const column of [columns.wealth, columns.planned, columns.shock, columns.childWealth]) column.set(numbers());
    for (const column of [...columns.aspirations, columns.investment, columns.consumption]) column.set(numbers());
    columns.met.set(bytes(3));
    columns.reached.set(bytes(3));
    columns.isolated.set(bytes(2));
    const changed = t === 0 || (run.tiesChange === true && t % 2 === 1);
    if (changed && t > 0) ties = randomTies(n, random, 2);
    const pocket = Int32Array.from(bytes(4), (k) => k - 1);
    const extras: Extras = {
      pocket,
      pocket_role: { codes: Uint8Array.from(pocket, (p) => (p < 0 ? 255 : p % 2)), names: ['core', 'fringe'] },
    };
    on.generation(
      {
        generation: t,
        decided: t < generations,
        columns,
        parentWealth: null,
        ties,
        underSociety: null,
        tiesChanged: changed,
      },
      extras,
    );
  }
  on.ends();
}

/** Rows of small tables a measuring listener would hand over. */
export function fakeRows(t: number, replicate: number): { indicators: Row[]; pockets: Row[] } {
  return {
    indicators: [{ generation: t, gini: AWKWARD[(t + replicate) % AWKWARD.length], modes: t === 0 ? null : t }],
    pockets: t % 2 === 0 ? [] : [{ generation: t, pocket: t, size: 5, fringe: 2, places: 1, mean_wealth: 1 / 3 }],
  };
}

/** Writes and commits the parts of one replicate. */
export function writeReplicate(run: FakeRun, replicate: number, writer: PartWriter): void {
  for (let arm = 0; arm < run.arms.length; arm++) {
    playArm(run, arm, replicate, {
      starts: (record) => writer.armStarts(record),
      generation: (record, extras) => {
        writer.generation(record, extras);
        const { indicators, pockets } = fakeRows(record.generation, replicate);
        writer.rows('indicators', indicators);
        writer.rows('pockets', pockets);
      },
      ends: () => {
        writer.rows('regimes', [{ regime: 'widening', slope: 0.5 }]);
        writer.keep('curve.json', JSON.stringify({ arm, replicate }));
        writer.armEnds();
      },
    });
  }
  writer.commit();
}
