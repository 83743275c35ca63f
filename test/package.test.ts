/**
 * The packed package, used elsewhere: its command and its library, with the runtime dependencies alone.
 */
import { execFileSync, spawnSync } from 'node:child_process';
import { existsSync, mkdirSync, readFileSync, symlinkSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { beforeAll, describe, expect, test } from 'vitest';
import { VERSION } from '../sim/version.js';
import { temporaryFolder } from './sim/command.js';

const root = fileURLToPath(new URL('..', import.meta.url));
const packageFile = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8')) as {
  version: string;
  bin: Record<string, string>;
};

describe('the packed package', () => {
  const folder = temporaryFolder();
  const modules = join(folder, 'node_modules');

  beforeAll(() => {
    const packed = JSON.parse(
      execFileSync('npm', ['pack', '--ignore-scripts', '--json', '--pack-destination', folder], {
        cwd: root,
        encoding: 'utf8',
        stdio: ['ignore', 'pipe', 'ignore'],
      }),
    ) as { filename: string }[] | Record<string, { filename: string }>;
    const [{ filename }] = Object.values(packed) as [{ filename: string }];
    mkdirSync(join(modules, 'rungsight'), { recursive: true });
    execFileSync('tar', ['-xzf', join(folder, filename), '-C', join(modules, 'rungsight'), '--strip-components', '1']);
    // the runtime dependencies of the lock file, and nothing that is there for development
    const lock = JSON.parse(readFileSync(join(root, 'package-lock.json'), 'utf8')) as {
      packages: Record<string, { dev?: boolean; devOptional?: boolean; optional?: boolean }>;
    };
    for (const [path, entry] of Object.entries(lock.packages)) {
      if (!/^node_modules\/(@[^/]+\/)?[^/]+$/.test(path) || entry.dev === true) continue;
      if (!existsSync(join(root, path))) continue;
      mkdirSync(dirname(join(folder, path)), { recursive: true });
      symlinkSync(join(root, path), join(folder, path));
    }
    writeFileSync(join(folder, 'package.json'), '{"type":"module"}');
  });

  test('carries the built program, the presets and the schema, and no tests or reference data', () => {
    const inside = join(modules, 'rungsight');
    for (const file of [
      packageFile.bin['rungsight']!,
      'presets/villages-apart.yaml',
      'dist/study.schema.json',
      'dist/viewer/index.html',
      'LICENSE',
      'README.md',
    ]) {
      expect(existsSync(join(inside, file)), file).toBe(true);
    }
    for (const file of ['test', 'sim', 'viewer', 'node_modules'])
      expect(existsSync(join(inside, file)), file).toBe(false);
  });

  test('its command runs a study', () => {
    const main = join(modules, 'rungsight', packageFile.bin['rungsight']!);
    const ran = spawnSync(
      process.execPath,
      [main, 'run', 'city-tight', '--replicates', '2', '--out', 'out', '--json'],
      {
        cwd: folder,
        encoding: 'utf8',
      },
    );
    expect(ran.stderr).toBe('');
    expect(ran.status).toBe(0);
    expect((JSON.parse(ran.stdout) as { answer: { arms: string[] } }).answer.arms).toEqual(['one city']);
    expect(existsSync(join(folder, 'out', 'panel.parquet'))).toBe(true);
  });

  test('its library measures', () => {
    writeFileSync(
      join(folder, 'use.mjs'),
      "import { gini, moran, fromPairs, VERSION } from 'rungsight';\n" +
        'const ties = fromPairs(3, Uint32Array.of(0, 1), Uint32Array.of(1, 2), null);\n' +
        "console.log(JSON.stringify([gini([1, 2, 3]), moran(ties, Float64Array.of(1, 2, 3), 'binary').i, VERSION]));\n",
    );
    const out = execFileSync(process.execPath, ['use.mjs'], { cwd: folder, encoding: 'utf8' });
    const [g, i, version] = JSON.parse(out) as [number, number, string];
    // by hand: Σ(2k − n − 1)y / (n Σ y) = (−2 + 6) / 18; Moran of a path of three with values 1, 2, 3 is 0
    expect(g).toBeCloseTo(4 / 18, 14);
    expect(i).toBeCloseTo(0, 14);
    expect(version).toBe(packageFile.version);
  });
});

test('the version is the one package.json states', () => {
  expect(VERSION).toBe(packageFile.version);
});
