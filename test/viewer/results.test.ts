/**
 * What the screen reads of a results folder is what the engine did: snapshots, ties, labels and axis ends, from
 * folders kept in several ways.
 */
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { memorySource } from '../../sim/results/bundle.js';
import type { Source as Files } from '../../sim/results/read.js';
import { loadInputs } from '../../sim/study/inputs.js';
import { parseStudy } from '../../sim/study/parse.js';
import { simulate } from '../../sim/study/replicate.js';
import { openFolder } from '../../viewer/data/results.js';
import { numbers, ROLE, type Source, text } from '../../viewer/data/source.js';
import { HAMLETS, type MadeResults, madeResults } from '../browser/results.js';

const SMALL = HAMLETS.replace('households: 600', 'households: 240')
  .replace('count: 20', 'count: 8')
  .replace('generations: 6', 'generations: 4')
  .replace('replicates: 3', 'replicates: 2');

/** What the engine had at a generation, by arm and generation. */
async function engine(
  yaml: string,
  replicate: number,
): Promise<Map<string, { wealth: Float64Array; planned: Float64Array; met: Uint8Array; aspiration: Float64Array }>> {
  const parsed = parseStudy(yaml, 'study.yaml');
  const inputs = await loadInputs(parsed, async () => null);
  const out = new Map();
  let arm = '';
  simulate({ study: parsed.study, inputs }, replicate, {
    armStarts: (record) => {
      arm = record.arm;
    },
    generation: ({ generation, columns }) => {
      out.set(`${arm}/${generation}`, {
        wealth: columns.wealth.slice(),
        planned: columns.planned.slice(),
        met: columns.met.slice(),
        aspiration: columns.aspirations[0].slice(),
      });
    },
    armEnds: () => {},
  });
  return out;
}

const same = (a: ArrayLike<number>, b: ArrayLike<number>): void => expect(Array.from(a)).toEqual(Array.from(b));

describe.each([
  ['Parquet', SMALL],
  ['CSV only', `${SMALL}keep: {formats: [csv]}\n`],
])('a folder kept as %s', (_name, yaml) => {
  let made: MadeResults;
  let source: Source;
  beforeAll(async () => {
    made = await madeResults(yaml);
    source = await openFolder(memorySource(made.files as ReadonlyMap<string, Uint8Array<ArrayBuffer>>), 'folder');
  });
  afterAll(() => made.remove());

  test('gives every generation as the engine had it', async () => {
    const truth = await engine(yaml, 1);
    for (const arm of [0, 1]) {
      const name = source.info.arms[arm].name;
      for (let t = 0; t < 4; t++) {
        const s = await source.snapshot(arm, 1, t);
        const e = truth.get(`${name}/${t}`);
        if (e === undefined) throw new Error('no such generation');
        expect(s.decided).toBe(true);
        same(s.wealth, e.wealth);
        same(s.planned, e.planned);
        same(s.met, e.met);
        same(s.aspirations[0], e.aspiration);
      }
      const last = await source.snapshot(arm, 1, 4);
      expect(last.decided).toBe(false);
      same(last.wealth, truth.get(`${name}/4`)?.wealth ?? []);
    }
  });

  test('knows least and largest wealth of each generation', async () => {
    const ends = await source.extents(0, 0);
    for (let t = 0; t <= 4; t++) {
      const { wealth } = await source.snapshot(0, 0, t);
      expect(ends[2 * t]).toBe(Math.min(...wealth));
      expect(ends[2 * t + 1]).toBe(Math.max(...wealth));
    }
  });

  test('gives ties that agree with the neighbour columns of the panel, and labels of all households', async () => {
    const ties = await source.ties(0, 0, 2);
    expect(await source.ties(0, 0, 3)).toBe(ties);
    const cast = await source.cast(0, 0);
    expect(cast.n).toBe(240);
    expect(cast.groups).toBe(2);
    expect(source.info.groupNames).toEqual(['shore', 'hill']);
    expect(cast.places).toBe(8);
    // mixing keeps degrees
    const mixed = await source.ties(1, 0, 2);
    const degree = (t: typeof ties): number[] => Array.from({ length: 240 }, (_, i) => t.start[i + 1] - t.start[i]);
    expect(degree(mixed)).toEqual(degree(ties));
    let within = 0;
    for (let i = 0; i < 240; i++)
      for (let e = ties.start[i]; e < ties.start[i + 1]; e++)
        if (cast.place[ties.target[e]] === cast.place[i]) within++;
    // asked for 0.97 of about 960 ties: within three standard errors
    expect(Math.abs(within / ties.target.length - 0.97)).toBeLessThan(
      3 * Math.sqrt((0.97 * 0.03) / (ties.target.length / 2)) + 0.01,
    );
  });

  test('pockets of the snapshot and of the table are the same', async () => {
    const table = await source.table('pockets');
    if (table === null) throw new Error('no pockets table');
    const arms = text(table, 'arm');
    const [rep, gen, id, size] = ['replicate', 'generation', 'pocket', 'size'].map((c) => numbers(table, c));
    let checked = 0;
    for (let k = 0; k < table.rows; k++) {
      if (arms[k] !== 'apart' || rep[k] !== 0 || !(size[k] > 0)) continue;
      const s = await source.snapshot(0, 0, gen[k]);
      let core = 0;
      for (let i = 0; i < s.pocket.length; i++) if (s.pocket[i] === id[k] && s.role[i] === ROLE.core) core++;
      expect(core).toBe(size[k]);
      checked++;
    }
    expect(checked).toBeGreaterThan(0);
  });

  test('frustrated share of the snapshot is the indicator', async () => {
    const table = await source.table('indicators');
    if (table === null) throw new Error('no indicators');
    const arms = text(table, 'arm');
    const [rep, gen, share] = ['replicate', 'generation', 'share_frustrated'].map((c) => numbers(table, c));
    for (let k = 0; k < table.rows; k++) {
      if (gen[k] === 4) {
        expect(share[k]).toBeNaN();
        continue;
      }
      const s = await source.snapshot(arms[k] === 'apart' ? 0 : 1, rep[k], gen[k]);
      // a mean of zeros and ones
      expect(s.met.filter((m) => m === 0).length / 240).toBeCloseTo(share[k], 12);
    }
  });
});

test('a thinned panel shows the households, generations and replicates it keeps', async () => {
  const made = await madeResults(`${SMALL}keep: {panel: {replicates: 1, every: 2, households: 60}}\n`);
  const source = await openFolder(memorySource(made.files as ReadonlyMap<string, Uint8Array<ArrayBuffer>>), 'folder');
  expect(source.info.shown).toEqual([0]);
  expect(source.info.every).toBe(2);
  const cast = await source.cast(0, 0);
  expect(cast.n).toBe(60);
  const truth = await engine(SMALL, 0);
  const s = await source.snapshot(0, 0, 2);
  const e = truth.get('apart/2');
  same(
    s.wealth,
    Array.from(cast.id, (id) => e?.wealth[id] ?? NaN),
  );
  const ties = await source.ties(0, 0, 2);
  expect(ties.n).toBe(60);
  await expect(source.snapshot(0, 0, 1)).rejects.toThrow('does not hold generation 1');
  made.remove();
});

test('reads only the row groups and columns it shows, each once', async () => {
  const made = await madeResults(SMALL);
  const files = memorySource(made.files as ReadonlyMap<string, Uint8Array<ArrayBuffer>>);
  let read = 0;
  const counted: Files = {
    place: files.place,
    async open(name) {
      const file = await files.open(name);
      if (file === null || name !== 'panel.parquet') return file;
      return {
        byteLength: file.byteLength,
        slice: (start, end) => {
          read += (end ?? file.byteLength) - start;
          return file.slice(start, end);
        },
      };
    },
  };
  const source = await openFolder(counted, 'folder');
  const footer = read;
  await source.snapshot(0, 0, 1);
  const once = read - footer;
  expect(once).toBeGreaterThan(0);
  // one arm and replicate of two each, and fewer than half of the columns
  expect(once).toBeLessThan((made.files.get('panel.parquet')?.length ?? 0) / 4);
  await source.snapshot(0, 0, 2);
  await source.extents(0, 0);
  expect(read - footer).toBe(once);
  made.remove();
});
