/**
 * Invented households for measuring how fast the screen draws: no study, no result, no engine.
 *
 * The numbers have the shape of a study (places, two arms, a share frustrated) and mean nothing.
 */
import { fromPairs, type Ties } from '../../network/graph.js';
import type { Model } from '../../sim/model/types.js';
import type { Cast, Snapshot, Source, StudyInfo, Table, TableName } from './source.js';

/** A repeatable stream of numbers in [0, 1): mulberry32, from memory. */
function stream(seed: number): () => number {
  let a = seed >>> 0;
  return () => {
    a = (a + 0x6d2b79f5) >>> 0;
    let t = Math.imul(a ^ (a >>> 15), 1 | a);
    t = (t + Math.imul(t ^ (t >>> 7), 61 | t)) ^ t;
    return ((t ^ (t >>> 14)) >>> 0) / 4294967296;
  };
}

function bell(u: () => number): number {
  return Math.sqrt(-2 * Math.log(1 - u())) * Math.cos(2 * Math.PI * u());
}

const model: Model = {
  technology: { kind: 'concave', scale: 8, elasticity: 0.6, depreciation: 1 },
  shock: { sdLog: 0.2, sharedByPlace: 0, risk: 'planned' },
  preferences: [
    { curvature: 0.6, childWeight: 0.5, milestoneShape: 'threshold', milestoneCurvature: 0.6, lossAversion: 1 },
  ],
  milestones: [
    {
      weight: 1,
      scale: 1,
      mix: [
        { from: 'neighbours', statistic: 'upward_mean', weight: 0.8, q: 0, window: 1 },
        { from: 'self', statistic: 'mean', weight: 0.1, q: 0, window: 1 },
        { from: 'society', statistic: 'mean', weight: 0.1, q: 0, window: 1 },
      ],
    },
  ],
  persistence: 0,
};

/**
 * A source of invented numbers.
 *
 * @param n - households in each of the two arms
 * @param degree - mean number of ties
 */
export function invented(n: number, degree = 8, generations = 8): Source {
  const u = stream(7);
  const places = Math.max(2, Math.round(n / 70));
  const place = new Uint32Array(n);
  const group = new Uint32Array(n);
  const level = Array.from({ length: places }, () => bell(u) * 0.5);
  const start = new Float64Array(n);
  for (let i = 0; i < n; i++) {
    place[i] = Math.floor((i / n) * places);
    group[i] = u() < 0.35 ? 1 : 0;
    start[i] = 40 * Math.exp(level[place[i]] + bell(u) * 0.45);
  }
  const cast: Cast = {
    n,
    id: Uint32Array.from({ length: n }, (_, i) => i),
    names: null,
    placeNames: null,
    place,
    places,
    group,
    groups: 2,
    childWeight: new Float64Array(n).fill(0.5),
    treated: null,
  };
  const graphs: Ties[] = [0.97, 0.05].map((within) => {
    const seen = new Set<number>();
    const a: number[] = [];
    const b: number[] = [];
    const per = n / places;
    while (a.length < (n * degree) / 2) {
      const i = Math.floor(u() * n);
      const j = u() < within ? Math.min(n - 1, Math.floor((place[i] + u()) * per)) : Math.floor(u() * n);
      const key = Math.min(i, j) * n + Math.max(i, j);
      if (i === j || seen.has(key)) continue;
      seen.add(key);
      a.push(i);
      b.push(j);
    }
    return fromPairs(n, Uint32Array.from(a), Uint32Array.from(b), null);
  });
  const snapshots = graphs.map((ties) => {
    const list: Snapshot[] = [];
    let wealth = start;
    for (let t = 0; t <= generations; t++) {
      const aspiration = new Float64Array(n);
      const planned = new Float64Array(n);
      const child = new Float64Array(n);
      const met = new Uint8Array(n);
      for (let i = 0; i < n; i++) {
        let sum = 0;
        let up = 0;
        for (let e = ties.start[i]; e < ties.start[i + 1]; e++) {
          if (wealth[ties.target[e]] > wealth[i]) {
            sum += wealth[ties.target[e]];
            up++;
          }
        }
        aspiration[i] = up > 0 ? (0.8 * sum) / up + 0.2 * wealth[i] : wealth[i];
        met[i] = aspiration[i] < 1.75 * wealth[i] ? 1 : 0;
        planned[i] = 6 * wealth[i] ** 0.55 * (met[i] === 1 ? 1.25 : 0.8);
        child[i] = planned[i] * Math.exp(bell(u) * 0.18);
      }
      const blank = new Uint8Array(n);
      const pocket = new Int32Array(n).fill(-1);
      const role = new Uint8Array(n);
      for (let i = 0; i < n; i++) {
        if (ties === graphs[0] && t > 1 && place[i] % 9 === 4 && met[i] === 0) {
          pocket[i] = place[i];
          role[i] = 2;
        }
      }
      list.push({
        generation: t,
        decided: t < generations,
        wealth,
        aspirations: [aspiration],
        planned,
        childWealth: child,
        met,
        isolated: blank,
        pocket,
        role,
        cause: Uint8Array.from(met, (m) => (m === 0 ? 1 : 0)),
        sheltered: blank,
        complacent: blank,
      });
      wealth = child;
    }
    return list;
  });
  const info: StudyInfo = {
    title: 'Invented villages',
    seed: 'none',
    version: '0',
    currency: 'units',
    yearsPerGeneration: 25,
    arms: ['kept apart', 'mixed'].map((name, k) => ({
      name,
      reached: { assortativity_place: k === 0 ? 0.96 : 0.02, economic_connectedness: k === 0 ? 0.61 : 0.99 },
      model,
    })),
    shown: [0],
    replicates: 1,
    generations,
    every: 1,
    households: n,
    groupNames: ['lowland', 'upland'],
    yaml: 'study: Invented villages\n',
  };
  const indicators = (): Table => {
    const arm: string[] = [];
    const columns = {
      replicate: [] as number[],
      generation: [] as number[],
      share_frustrated: [] as number[],
    };
    snapshots.forEach((list, k) => {
      for (const s of list) {
        arm.push(info.arms[k].name);
        columns.replicate.push(0);
        columns.generation.push(s.generation);
        columns.share_frustrated.push(s.decided ? s.met.reduce((sum, m) => sum + (m === 0 ? 1 : 0), 0) / n : NaN);
      }
    });
    return {
      rows: arm.length,
      columns: {
        arm,
        replicate: Float64Array.from(columns.replicate),
        generation: Float64Array.from(columns.generation),
        share_frustrated: Float64Array.from(columns.share_frustrated),
      },
    };
  };
  const pockets = (): Table => {
    const rows: { generation: number; pocket: number; size: number; wealth: number }[] = [];
    for (const s of snapshots[0]) {
      if (!s.decided) continue;
      const members = new Map<number, number[]>();
      s.pocket.forEach((p, i) => {
        if (p >= 0) members.set(p, [...(members.get(p) ?? []), i]);
      });
      for (const [pocket, list] of members)
        rows.push({
          generation: s.generation,
          pocket,
          size: list.length,
          wealth: list.reduce((sum, i) => sum + s.wealth[i], 0) / list.length,
        });
    }
    const column = (value: (r: (typeof rows)[number]) => number): Float64Array => Float64Array.from(rows, value);
    return {
      rows: rows.length,
      columns: {
        arm: rows.map(() => info.arms[0].name),
        replicate: column(() => 0),
        generation: column((r) => r.generation),
        pocket: column((r) => r.pocket),
        size: column((r) => r.size),
        fringe: column((r) => Math.round(r.size / 3)),
        places: column(() => 1),
        mean_wealth: column((r) => r.wealth),
        p_value: column((r) => (r.pocket % 2 === 0 ? 0.005 : 0.04)),
        event: rows.map(() => 'grows'),
        parent: column(() => NaN),
        local: column((r) => r.size - 2),
        general: column(() => 2),
      },
    };
  };
  return {
    kind: 'page',
    info,
    cast: async () => cast,
    ties: async (arm) => graphs[arm],
    snapshot: async (arm, _replicate, generation) => snapshots[arm][generation],
    extents: async (arm) => {
      const out = new Float64Array(2 * (generations + 1));
      snapshots[arm].forEach((s, t) => {
        out[2 * t] = s.wealth.reduce((a, b) => Math.min(a, b), Infinity);
        out[2 * t + 1] = s.wealth.reduce((a, b) => Math.max(a, b), 0);
      });
      return out;
    },
    table: async (name: TableName) => (name === 'indicators' ? indicators() : name === 'pockets' ? pockets() : null),
    files: async () => [],
    file: async () => new Uint8Array(),
    close: () => {},
  };
}
