/**
 * A million rows, five covariates, effects of 10,000 and 100 levels absorbed, errors clustered by the first: seconds
 * and memory, beside a numpy script that does the same by hand (estimate.py). Run: npx tsx test/bench/estimate.ts
 *
 * Asks: below 10 seconds, below 1 GiB beyond the columns. Fails when it is not so, or when the two disagree.
 */
import { spawnSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import seedrandom from 'seedrandom';
import { groupsOf } from '../../sim/estimate/groups.js';
import { ols } from '../../sim/estimate/ols.js';

const n = Number(process.argv[2] ?? 1_000_000);
const k = 5;
const LEVELS = [10_000, 100];

const random = seedrandom('bench');
const codes = LEVELS.map((levels) => Int32Array.from({ length: n }, () => Math.floor(random() * levels)));
const effects = LEVELS.map((levels) => Float64Array.from({ length: levels }, () => random() - 0.5));
const X = Array.from({ length: k }, () => new Float64Array(n));
const y = new Float64Array(n);
for (let i = 0; i < n; i++) {
  for (let j = 0; j < k; j++) {
    X[j][i] = random() + effects[0][codes[0][i]];
    y[i] += (j + 1) * X[j][i];
  }
  y[i] += effects[0][codes[0][i]] + effects[1][codes[1][i]] + random();
}

const folder = mkdtempSync(join(tmpdir(), 'estimate-bench-'));
writeFileSync(join(folder, 'y.f64'), y);
X.forEach((x, j) => {
  writeFileSync(join(folder, `x${j}.f64`), x);
});
codes.forEach((c, e) => {
  writeFileSync(join(folder, `g${e}.i32`), c);
});

const before = process.resourceUsage().maxRSS;
const start = performance.now();
const groups = codes.map((c, e) => groupsOf(`g${e}`, c));
const fit = ols({
  place: 'bench',
  outcome: { name: 'y', values: y },
  covariates: X.map((values, j) => ({ name: `x${j}`, values })),
  constant: true,
  effects: groups,
  clusters: [groups[0]],
  errors: 'clustered',
  level: 0.95,
});
const seconds = (performance.now() - start) / 1000;
const bytes = (process.resourceUsage().maxRSS - before) * 1024;
const mebibytes = (b: number): string => `${(b / 2 ** 20).toFixed(0)} MiB`;
console.log(`ours   ${seconds.toFixed(2)} s, ${mebibytes(bytes)} beyond the columns`);

const run = spawnSync('python3', [new URL('estimate.py', import.meta.url).pathname, folder, String(n), String(k)], {
  encoding: 'utf8',
});
rmSync(folder, { recursive: true });
let disagree = false;
if (run.status === 0) {
  const other = JSON.parse(run.stdout) as { seconds: number; bytes: number; b: number[]; se: number[] };
  console.log(`numpy  ${other.seconds.toFixed(2)} s, ${mebibytes(other.bytes)} beyond the columns`);
  console.log(
    `ratio  ${(other.seconds / seconds).toFixed(2)} times as fast, ${(other.bytes / bytes).toFixed(2)} of the memory`,
  );
  const apart = Math.max(
    ...fit.terms.map((term, j) =>
      Math.max(Math.abs(term.estimate / other.b[j] - 1), Math.abs(term.std_error / other.se[j] - 1)),
    ),
  );
  console.log(`apart  ${apart.toExponential(1)}`);
  disagree = !(apart < 1e-8);
} else console.log('numpy  not available');
if (seconds > 10 || bytes > 2 ** 30 || disagree) process.exitCode = 1;
