/**
 * Runs that are stopped: killed at random moments and resumed, the folder is the same to the byte as without.
 */
import { spawn } from 'node:child_process';
import { existsSync, readdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import seedrandom from 'seedrandom';
import { describe, expect, test } from 'vitest';
import { MAIN, rungsight, temporaryFolder } from './command.js';

const STUDY = `study: Stopped and resumed
seed: resume-1
replicates: 6
generations: 8
population:
  households: 500
  places: 10
  wealth: {shape: lognormal, mean: 50, sd_log: 0.6, between_places: 0.5}
technology: {kind: concave, scale: 8, elasticity: 0.6}
shock: {sd_log: 0.2}
preferences: {curvature: 0.6, child_weight: 0.5}
reference:
  milestones:
    - weight: 1
      mix:
        - {from: neighbours, statistic: upward_mean, weight: 0.8}
        - {from: self, weight: 0.2}
arms:
  - name: apart
    network: {kind: blocks, mean_degree: 8, within_place: 0.9}
  - name: mixed
    network: {from: apart, mixing: {share: 1}}
keep: {formats: [parquet, csv]}
`;

/** Starts the command and kills it once its unfinished folder looks so; false when it ended by itself before. */
function killed(
  args: readonly string[],
  cwd: string,
  when: (files: readonly string[]) => boolean,
  signal: NodeJS.Signals,
): Promise<{ killed: boolean; err: string; status: number | null }> {
  return new Promise((done) => {
    const child = spawn(process.execPath, [MAIN, ...args], { cwd, stdio: ['ignore', 'ignore', 'pipe'] });
    const partial = join(cwd, `${args[Math.max(args.indexOf('--out'), args.indexOf('--resume')) + 1]}.partial`);
    let err = '';
    let sent = false;
    child.stderr.on('data', (chunk) => {
      err += chunk;
    });
    const timer = setInterval(() => {
      const files = existsSync(partial) ? (readdirSync(partial, { recursive: true }) as string[]) : [];
      if (sent || !when(files)) return;
      sent = true;
      child.kill(signal);
    }, 4);
    child.on('exit', (status) => {
      clearInterval(timer);
      done({ killed: status === null, err, status });
    });
  });
}

/** Parts that are there. */
const parts = (files: readonly string[]): number => files.filter((file) => file.startsWith('parts')).length;

function hashes(folder: string): [string, string][] {
  const manifest = JSON.parse(readFileSync(join(folder, 'manifest.json'), 'utf8')) as {
    state: string;
    files: { name: string; sha256: string }[];
  };
  expect(manifest.state).toBe('complete');
  return manifest.files.map((file) => [file.name, file.sha256]);
}

describe('a stopped run', () => {
  const folder = temporaryFolder();
  writeFileSync(join(folder, 's.yaml'), STUDY);

  test('killed at random moments and resumed gives the same bytes as one that was not', async () => {
    expect(rungsight(['run', 's.yaml', '--out', 'straight'], folder).status).toBe(0);

    // before a first file, in the middle of replicates, while the final tables are written, and at random in between
    const random = seedrandom('moments');
    const moments: ((files: readonly string[]) => boolean)[] = [
      (files) => parts(files) >= 1,
      (files) => parts(files) >= 20 + random() * 20,
      (files) => parts(files) >= 60 + random() * 40,
      (files) => files.some((file) => file.startsWith('panel')),
      (files) => files.some((file) => file.startsWith('contrasts')),
    ];
    let kills = 0;
    for (const when of moments) {
      const resumable = existsSync(join(folder, 'stopped.partial', 'manifest.json'));
      const args = resumable ? ['run', '--resume', 'stopped'] : ['run', 's.yaml', '--out', 'stopped'];
      if (existsSync(join(folder, 'stopped'))) break;
      if ((await killed(args, folder, when, 'SIGKILL')).killed) kills++;
    }
    expect(kills).toBeGreaterThanOrEqual(3);
    if (!existsSync(join(folder, 'stopped'))) {
      expect(rungsight(['run', '--resume', 'stopped'], folder).status).toBe(0);
    }
    expect(hashes(join(folder, 'stopped'))).toEqual(hashes(join(folder, 'straight')));
    expect(readdirSync(folder).filter((name) => name.startsWith('stopped'))).toEqual(['stopped']);
  }, 240_000);

  test('Ctrl-C says what is kept and how to go on', async () => {
    const result = await killed(
      ['run', 's.yaml', '--out', 'interrupted', '--threads', '1'],
      folder,
      (files) => parts(files) > 0,
      'SIGINT',
    );
    expect(result.status).toBe(1);
    expect(result.err).toContain(
      'of 6 replicates are kept in interrupted.partial; go on with: npx rungsight run --resume interrupted',
    );
    expect(result.err).not.toContain(' at ');
    const manifest = JSON.parse(readFileSync(join(folder, 'interrupted.partial', 'manifest.json'), 'utf8')) as {
      state: string;
    };
    expect(manifest.state).toBe('partial');
    expect(rungsight(['run', '--resume', 'interrupted'], folder).status).toBe(0);
    expect(hashes(join(folder, 'interrupted'))).toEqual(hashes(join(folder, 'straight')));
  });

  test('one stopped before its last step, the renaming, needs only that', () => {
    renameSync(join(folder, 'interrupted'), join(folder, 'named.partial'));
    const ran = rungsight(['run', '--resume', 'named'], folder);
    expect(ran.status).toBe(0);
    expect(ran.out).toContain('the run was complete');
    expect(hashes(join(folder, 'named'))).toEqual(hashes(join(folder, 'straight')));
  });

  test('another study cannot be resumed into it, and a whole folder is not overwritten', () => {
    writeFileSync(join(folder, 'other.yaml'), STUDY.replace('resume-1', 'resume-2'));
    const taken = rungsight(['run', 'other.yaml', '--out', 'straight'], folder);
    expect(taken.status).toBe(2);
    expect(taken.err).toMatch(/straight/);
    const whole = rungsight(['run', '--resume', 'straight'], folder);
    expect(whole.status).toBe(2);
    const none = rungsight(['run', '--resume', 'nowhere'], folder);
    expect(none.status).toBe(2);
    expect(none.err).not.toContain(' at ');
  });
});
