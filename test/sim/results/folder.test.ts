/** Folders on disk: stopped anywhere and resumed they come out the same to the byte; mistakes of the user are named. */
import { spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import {
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  truncateSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, test } from 'vitest';
import { InputError } from '../../../network/errors.js';
import type { Codebook } from '../../../sim/results/codebook.js';
import { folderStore, type RunFolder, resumeRun, startRun, studyHash } from '../../../sim/results/folder.js';
import type { Manifest, ManifestHead } from '../../../sim/results/manifest.js';
import { openResults } from '../../../sim/results/open.js';
import { PartWriter } from '../../../sim/results/parts.js';
import { CsvReader } from '../../../sim/results/read-csv.js';
import type { Store } from '../../../sim/results/store.js';
import { FACTS, type FakeRun, writeReplicate } from './fake-run.js';

const RUN: FakeRun = { n: 12, generations: 3, arms: ['apart', 'mixed'], replicates: 2, tiesChange: true };
const FORMATS = ['parquet', 'csv'] as const;
const HEAD: ManifestHead = {
  version: '1.2.3',
  study: 'Two valleys',
  studyHash: studyHash('study: Two valleys\n'),
  seed: 'valley-1',
  arms: RUN.arms,
  replicates: RUN.replicates,
  generations: RUN.generations,
  households: RUN.n,
  started: '2026-01-01T00:00:00Z',
};

const scratch = mkdtempSync(join(tmpdir(), 'results-'));
afterAll(() => rmSync(scratch, { recursive: true, force: true }));

function begin(dir: string): RunFolder {
  return startRun(dir, { head: HEAD, studyYaml: 'study: Two valleys\n' });
}

/** Does what is left to do. `watched` may look at, or stop, every step that touches the disk. */
async function complete(folder: RunFolder, watched: (store: Store) => Store = (store) => store): Promise<void> {
  if (folder.finished) return;
  const done = new Set(folder.completeReplicates());
  const store = watched(folderStore(folder.partial));
  for (let r = 0; r < RUN.replicates; r++) {
    if (done.has(r)) continue;
    writeReplicate(RUN, r, new PartWriter({ store, facts: FACTS, formats: FORMATS, keep: 'all', replicate: r }));
  }
  await folder.assemble(FACTS, FORMATS);
  const curve = folder.kept('curve.json', 1, 0);
  expect(new TextDecoder().decode(curve ?? new Uint8Array(0))).toBe('{"arm":1,"replicate":0}');
  folder.writeTable(FACTS, 'incidence', [{ arm: 'apart', generation: 0, percentile: 5, growth: 1.1 }]);
  folder.writeCodebook(FACTS);
  await folder.finish({ seconds: 1, peakMemory: 2, notes: { networks: [] } });
}

function contents(dir: string): Record<string, string> {
  const out: Record<string, string> = {};
  for (const name of readdirSync(dir).sort()) out[name] = readFileSync(join(dir, name)).toString('base64');
  return out;
}

let straight: Record<string, string> | null = null;
async function uninterrupted(): Promise<Record<string, string>> {
  if (straight === null) {
    const dir = join(scratch, 'straight');
    await complete(begin(dir));
    straight = contents(dir);
  }
  return straight;
}

function expectSameFolder(dir: string, want: Record<string, string>): void {
  const got = contents(dir);
  expect(Object.keys(got)).toEqual(Object.keys(want));
  for (const name of Object.keys(want)) if (got[name] !== want[name]) throw new Error(`${name} differs`);
  expect(existsSync(`${dir}.partial`)).toBe(false);
}

function problem(work: () => unknown): string {
  try {
    work();
  } catch (error) {
    if (error instanceof InputError) return error.problems[0].code;
    throw error;
  }
  return 'none';
}

class Stop extends Error {}

/** A store that stops the work before its k-th step, and counts them. */
function stopAt(k: number, counted = { steps: 0 }): (store: Store) => Store {
  const count = (): void => {
    if (++counted.steps === k) throw new Stop();
  };
  return (store) => ({
    ...store,
    create(name) {
      count();
      const sink = store.create(name);
      return {
        write(bytes) {
          count();
          sink.write(bytes);
        },
        close() {
          count();
          sink.close();
        },
      };
    },
    remove(name) {
      count();
      store.remove(name);
    },
  });
}

describe('a whole folder', () => {
  test('says complete, with the size and hash of every file', async () => {
    const files = await uninterrupted();
    const manifest = JSON.parse(Buffer.from(files['manifest.json'], 'base64').toString()) as Manifest;
    expect(manifest.state).toBe('complete');
    expect(manifest.files.map(({ name }) => name)).toEqual(
      Object.keys(files).filter((name) => name !== 'manifest.json'),
    );
    for (const { name, bytes, sha256 } of manifest.files) {
      const content = Buffer.from(files[name], 'base64');
      expect(content.length).toBe(bytes);
      expect(createHash('sha256').update(content).digest('hex')).toBe(sha256);
    }
    // FIPS 180-4, the test vector "abc"
    expect(studyHash('abc')).toBe('ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad');
  });

  test('has a codebook that describes every column of every table, and no other', async () => {
    const files = await uninterrupted();
    const text = (name: string): string => Buffer.from(files[name], 'base64').toString();
    const book = JSON.parse(text('codebook.json')) as Codebook;
    const described = book.resources.flatMap((resource) => [resource.path, ...(resource.alsoAs ?? [])]);
    const tables = Object.keys(files).filter((name) => /\.(csv|parquet)$/.test(name));
    expect(described.sort()).toEqual(tables.sort());
    const results = await openResults(join(scratch, 'straight'));
    for (const resource of book.resources) {
      for (const path of [resource.path, ...(resource.alsoAs ?? [])]) {
        if (!path.endsWith('.csv')) continue;
        const rows: string[][] = [];
        const reader = new CsvReader((cells) => rows.push(cells));
        reader.push(text(path));
        reader.end();
        expect(rows[0]).toEqual(resource.schema.fields.map(({ name }) => name));
        for (const row of rows) expect(row.length).toBe(rows[0].length);
        // a column said to be required has no empty cell
        resource.schema.fields.forEach((field, c) => {
          if (field.constraints.required) expect(rows.findIndex((row) => row[c] === '')).toBe(-1);
        });
      }
      const table = await results.table(resource.name);
      expect(table?.names).toEqual(resource.schema.fields.map(({ name }) => name));
      const names = resource.schema.fields.map(({ name }) => name);
      for (const key of resource.schema.primaryKey) expect(names).toContain(key);
      for (const field of resource.schema.fields) {
        expect(field.description.length).toBeGreaterThan(5);
        expect(field.formula).not.toBe('');
        expect(text('codebook.md')).toContain(`| \`${field.name}\` |`);
      }
    }
  });
});

describe('a stopped run', () => {
  test('comes out the same wherever writing was stopped', async () => {
    const want = await uninterrupted();
    const counted = { steps: 0 };
    await complete(begin(join(scratch, 'counted')), stopAt(Number.POSITIVE_INFINITY, counted));
    expect(counted.steps).toBeGreaterThan(50);
    // 19 shares no rhythm with the files of an arm: creating, writing and closing all kinds of parts come round
    for (let k = 1; k <= counted.steps; k += 19) {
      const dir = join(scratch, `stopped-${k}`);
      await expect(complete(begin(dir), stopAt(k))).rejects.toBeInstanceOf(Stop);
      const manifest = JSON.parse(readFileSync(join(`${dir}.partial`, 'manifest.json'), 'utf8')) as Manifest;
      expect(manifest.state).toBe('partial');
      expect(existsSync(dir)).toBe(false);
      await complete(resumeRun(dir, { studyHash: HEAD.studyHash, version: HEAD.version }));
      expectSameFolder(dir, want);
      rmSync(dir, { recursive: true });
    }
  }, 60_000);

  test('keeps the replicates that were done, and takes no part for whole that is not', async () => {
    const want = await uninterrupted();
    const dir = join(scratch, 'truncated');
    const folder = begin(dir);
    for (let r = 0; r < 2; r++) {
      const store = folderStore(folder.partial);
      writeReplicate(RUN, r, new PartWriter({ store, facts: FACTS, formats: FORMATS, keep: 'all', replicate: r }));
    }
    expect(resumeRun(dir).completeReplicates()).toEqual([0, 1]);
    const part = join(`${dir}.partial`, 'parts', 'r00001-a001.panel.parquet');
    truncateSync(part, 100);
    expect(resumeRun(dir).completeReplicates()).toEqual([0]);
    rmSync(part);
    expect(resumeRun(`${dir}.partial`).completeReplicates()).toEqual([0]);
    writeFileSync(join(`${dir}.partial`, 'parts', 'r00000.json'), '{"replicate":0,"files":');
    expect(resumeRun(dir).completeReplicates()).toEqual([]);
    await complete(resumeRun(dir));
    expectSameFolder(dir, want);
  });

  test('stopped while tables were put together, or just before its last step, goes on', async () => {
    const want = await uninterrupted();
    const dir = join(scratch, 'late');
    const folder = begin(dir);
    for (let r = 0; r < 2; r++) {
      const store = folderStore(folder.partial);
      writeReplicate(RUN, r, new PartWriter({ store, facts: FACTS, formats: FORMATS, keep: 'all', replicate: r }));
    }
    await folder.assemble(FACTS, FORMATS);
    // half a table under the name it has while it is written
    writeFileSync(join(folder.partial, 'ties.csv.writing'), 'arm,repl');
    const resumed = resumeRun(dir);
    expect(resumed.completeReplicates()).toEqual([0, 1]);
    await complete(resumed);
    expectSameFolder(dir, want);

    // the manifest says complete but the folder has not taken its place yet
    const again = join(scratch, 'later');
    mkdirSync(join(`${again}.partial`, 'parts'), { recursive: true });
    for (const [name, content] of Object.entries(want)) {
      writeFileSync(join(`${again}.partial`, name), Buffer.from(content, 'base64'));
    }
    writeFileSync(join(`${again}.partial`, 'parts', 'r00000.json'), '{}');
    const last = resumeRun(again);
    expect(last.finished).toBe(true);
    expect(last.completeReplicates()).toEqual([0, 1]);
    expectSameFolder(again, want);
  });

  test('killed by the system leaves a folder that says partial and resumes to the same bytes', async () => {
    const want = await uninterrupted();
    const dir = join(scratch, 'killed');
    const child = join(scratch, 'child.ts');
    const from = (file: string): string => JSON.stringify(join(import.meta.dirname, file));
    writeFileSync(
      child,
      `import { folderStore, startRun } from ${from('../../../sim/results/folder.ts')};
import { PartWriter } from ${from('../../../sim/results/parts.ts')};
import { FACTS, writeReplicate } from ${from('fake-run.ts')};
const folder = startRun(${JSON.stringify(dir)}, { head: ${JSON.stringify(HEAD)}, studyYaml: 'study: Two valleys\\n' });
let files = 0;
const store = folderStore(folder.partial);
const killing = { ...store, create(name) { if (++files === 40) process.kill(process.pid, 'SIGKILL'); return store.create(name); } };
for (let r = 0; r < 2; r++) {
  writeReplicate(${JSON.stringify(RUN)}, r, new PartWriter({ store: killing, facts: FACTS, formats: ${JSON.stringify(FORMATS)}, keep: 'all', replicate: r }));
}
`,
    );
    const ended = spawnSync(process.execPath, ['--import', 'tsx', child], { encoding: 'utf8' });
    expect(ended.signal).toBe('SIGKILL');
    const resumed = resumeRun(dir);
    expect(resumed.manifest.state).toBe('partial');
    expect(resumed.completeReplicates()).toEqual([0]);
    await complete(resumed);
    expectSameFolder(dir, want);
  }, 60_000);
});

describe('mistakes are named', () => {
  test('a folder that is taken, an unfinished run, nothing to resume, another study', async () => {
    await uninterrupted();
    const straightDir = join(scratch, 'straight');
    expect(problem(() => begin(straightDir))).toBe('results-exist');
    expect(problem(() => resumeRun(straightDir))).toBe('results-complete');
    const dir = join(scratch, 'mistakes');
    expect(problem(() => resumeRun(dir))).toBe('no-such-results');
    begin(dir);
    expect(problem(() => begin(dir))).toBe('results-unfinished');
    expect(problem(() => resumeRun(dir, { studyHash: 'another' }))).toBe('other-study');
    expect(problem(() => resumeRun(dir, { version: '1.2.4' }))).toBe('other-version');
    mkdirSync(dir);
    expect(problem(() => resumeRun(dir))).toBe('none');
    writeFileSync(join(dir, 'mine.txt'), 'x');
    expect(problem(() => resumeRun(dir))).toBe('results-exist');
    await expect(openResults(`${dir}.partial`)).rejects.toThrow('the run has not finished; go on with it by --resume');
    await expect(openResults(join(scratch, 'nowhere'))).rejects.toThrow('there is no manifest.json');
  });
});
