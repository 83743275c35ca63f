/** The program's version, as package.json states it. */
import { readFileSync } from 'node:fs';

interface PackageFile {
  readonly version: string;
}

// dist/sim/command → the package's root
const packageFile = new URL('../../../package.json', import.meta.url);

export const VERSION = (JSON.parse(readFileSync(packageFile, 'utf8')) as PackageFile).version;
