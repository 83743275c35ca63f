/**
 * Runs that are stopped: killed at random moments and resumed, the folder is the same to the byte as without.
 */
import { spawn } from 'node:child_process';
import { existsSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
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

/** Starts the command and kills it after some milliseconds, or once its first part is on disk. */
function killed(
  args: readonly string[],
  cwd: string,
  after: number | 'begun',
  signal: NodeJS.Signals,
): Promise<{ ended: boolean; err: string; status: number | null }> {
  return new Promise((done) => {
    const child = spawn(process.execPath, [MAIN, ...args], { cwd, stdio: ['ignore', 'ignore', 'pipe'] });
    let err = '';
    child.stderr.on('data', (chunk) => {
      err += chunk;
    });
    const begun = (): boolean => {
      const parts = join(cwd, `${args[args.indexOf('--out') + 1]}.partial`, 'parts');
      return existsSync(parts) && readdirSync(parts).length > 0;
    };
    const timer =
      after === 'begun'
        ? setInterval(() => {
            if (!begun()) return;
            clearInterval(timer);
            child.kill(signal);
          }, 20)
        : setTimeout(() => child.kill(signal), after);
    child.on('exit', (status) => {
      clearTimeout(timer);
      done({ ended: status === 0, err, status });
    });
  });
}

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
    const began = performance.now();
    const straight = rungsight(['run', 's.yaml', '--out', 'straight'], folder);
    const whole = performance.now() - began;
    expect(straight.status).toBe(0);

    const random = seedrandom('moments');
    let kills = 0;
    let ended = false;
    for (let tries = 0; tries < 25 && !ended; tries++) {
      const resumable = existsSync(join(folder, 'stopped.partial', 'manifest.json'));
      const args = resumable ? ['run', '--resume', 'stopped'] : ['run', 's.yaml', '--out', 'stopped'];
      // anywhere in a run's length, so also before the first file and while tables are written; later ones let it end
      const result = await killed(args, folder, whole * (0.1 + random() * (0.4 + tries / 10)), 'SIGKILL');
      // killed after its last file: the folder is whole all the same
      ended = result.ended || existsSync(join(folder, 'stopped', 'manifest.json'));
      if (!ended) kills++;
    }
    expect(ended).toBe(true);
    // how many depends on the speed of the machine in this minute
    expect(kills).toBeGreaterThan(0);
    expect(hashes(join(folder, 'stopped'))).toEqual(hashes(join(folder, 'straight')));
    expect(readdirSync(folder).filter((name) => name.startsWith('stopped'))).toEqual(['stopped']);
  }, 240_000);

  test('Ctrl-C says what is kept and how to go on', async () => {
    const result = await killed(['run', 's.yaml', '--out', 'interrupted', '--threads', '1'], folder, 'begun', 'SIGINT');
    expect(result.status).toBe(1);
    expect(result.err).toContain(
      'of 6 replicates are kept in interrupted.partial; go on with: rungsight run --resume interrupted',
    );
    expect(result.err).not.toContain(' at ');
    const manifest = JSON.parse(readFileSync(join(folder, 'interrupted.partial', 'manifest.json'), 'utf8')) as {
      state: string;
    };
    expect(manifest.state).toBe('partial');
    expect(rungsight(['run', '--resume', 'interrupted'], folder).status).toBe(0);
    expect(hashes(join(folder, 'interrupted'))).toEqual(hashes(join(folder, 'straight')));
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
