/**
 * Last step of the build: writes the JSON Schema beside the code and makes the command callable from a checkout.
 */
import { chmodSync, existsSync, mkdirSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { studyJsonSchema } from '../study/schema.js';

const dist = join(dirname(fileURLToPath(import.meta.url)), '..', '..');
const main = join(dist, 'sim', 'command', 'main.js');

writeFileSync(join(dist, 'study.schema.json'), `${JSON.stringify(studyJsonSchema(), null, 2)}\n`);
chmodSync(main, 0o755);

// `npx rungsight` in a checkout finds the command where it finds those of the dependencies
const modules = join(dist, '..', 'node_modules');
if (existsSync(modules) && process.platform !== 'win32') {
  const link = join(modules, '.bin', 'rungsight');
  mkdirSync(dirname(link), { recursive: true });
  rmSync(link, { force: true });
  symlinkSync('../../dist/sim/command/main.js', link);
}
