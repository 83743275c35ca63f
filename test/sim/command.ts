/** Runs the built command as a user would, in a folder of its own. */
import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';

export const MAIN = fileURLToPath(new URL('../../dist/sim/command/main.js', import.meta.url));

export interface Ran {
  readonly status: number | null;
  readonly out: string;
  readonly err: string;
}

/** Runs `rungsight ARGS` in a folder. */
export function rungsight(args: readonly string[], cwd: string): Ran {
  const ran = spawnSync(process.execPath, [MAIN, ...args], { cwd, encoding: 'utf8', maxBuffer: 1 << 28 });
  return { status: ran.status, out: ran.stdout, err: ran.stderr };
}

export function temporaryFolder(): string {
  return mkdtempSync(join(tmpdir(), 'rungsight-'));
}

/** A CSV without quoted fields, as columns of text. */
export function csvColumns(file: string): { rows: number; names: string[]; column: (name: string) => string[] } {
  const lines = readFileSync(file, 'utf8').trimEnd().split(/\r?\n/);
  const names = lines[0]!.split(',');
  const cells = lines.slice(1).map((line) => line.split(','));
  return {
    rows: cells.length,
    names,
    column: (name) => {
      const at = names.indexOf(name);
      if (at < 0) throw new Error(`${file} has no column ${name}`);
      return cells.map((row) => row[at]!);
    },
  };
}
