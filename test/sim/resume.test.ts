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
replicates: 8
generations: 6
population:
  households: 1500
  places: 20
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

/** Starts the command and kills it after some milliseconds; true when it had ended by itself. */
function killed(
  args: readonly string[],
  cwd: string,
  after: number,
  signal: NodeJS.Signals,
): Promise<{ ended: boolean; err: string; status: number | null }> {
  return new Promise((done) => {
    const child = spawn(process.execPath, [MAIN, ...args], { cwd, stdio: ['ignore', 'ignore', 'pipe'] });
    let err = '';
    child.stderr.on('data', (chunk) => {
      err += chunk;
    });
    const timer = setTimeout(() => child.kill(signal), after);
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
    const straight = rungsight(['run', 's.yaml', '--out', 'straight'], folder);
    expect(straight.status).toBe(0);

    const random = seedrandom('moments');
    let kills = 0;
    let ended = false;
    for (let tries = 0; tries < 25 && !ended; tries++) {
      const resumable = existsSync(join(folder, 'stopped.partial', 'manifest.json'));
      const args = resumable ? ['run', '--resume', 'stopped'] : ['run', 's.yaml', '--out', 'stopped'];
      // some kills come before the first file is there, some in the middle of the tables; later ones give it time to end
      const result = await killed(args, folder, 250 + random() * (400 + 250 * tries), 'SIGKILL');
      ended = result.ended;
      if (!ended) kills++;
    }
    expect(ended).toBe(true);
    expect(kills).toBeGreaterThan(2);
    expect(hashes(join(folder, 'stopped'))).toEqual(hashes(join(folder, 'straight')));
    expect(readdirSync(folder).filter((name) => name.startsWith('stopped'))).toEqual(['stopped']);
  });

  test('Ctrl-C says what is kept and how to go on', async () => {
    const result = await killed(['run', 's.yaml', '--out', 'interrupted', '--threads', '1'], folder, 1500, 'SIGINT');
    expect(result.status).toBe(1);
    expect(result.err).toContain(
      'of 8 replicates are kept in interrupted.partial; go on with: rungsight run --resume interrupted',
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
