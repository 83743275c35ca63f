/**
 * A browser for the tests, on a bare machine too: an installed Chromium or Chrome where there is one, else the one
 * that the package @sparticuz/chromium brings (linux x64), unpacked once into the temporary folder.
 */
import { execFileSync } from 'node:child_process';
import { existsSync, mkdirSync, readFileSync, renameSync, rmSync, writeFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { brotliDecompressSync } from 'node:zlib';
import { type Browser, chromium } from 'playwright-core';

const FLAGS = [
  '--headless',
  '--no-sandbox',
  '--use-angle=swiftshader',
  '--enable-unsafe-swiftshader',
  '--no-first-run',
  '--disable-quic',
  '--disable-background-networking',
  '--disable-component-update',
  '--disable-sync',
];

/** Where systems keep a browser; `CHROME_PATH` goes first, and `packaged` there asks for the package's. */
const INSTALLED = [
  process.env.CHROME_PATH ?? '',
  '/usr/bin/chromium',
  '/usr/bin/chromium-browser',
  '/usr/bin/google-chrome',
  '/usr/bin/google-chrome-stable',
  '/Applications/Google Chrome.app/Contents/MacOS/Google Chrome',
];

/** Starts a headless browser that draws in software. */
export async function launch(): Promise<Browser> {
  const wanted = process.env.CHROME_PATH;
  const installed = wanted === 'packaged' ? undefined : INSTALLED.find((path) => path !== '' && existsSync(path));
  if (installed !== undefined) return chromium.launch({ executablePath: installed, args: FLAGS });
  const { executable, env } = await packaged();
  return chromium.launch({ executablePath: executable, args: FLAGS, env: { ...process.env, ...env } });
}

/** The browser of the package, with the libraries a bare system lacks. */
async function packaged(): Promise<{ executable: string; env: Record<string, string> }> {
  const folder = join(tmpdir(), 'rungsight-chromium');
  const bin = join(dirname(createRequire(import.meta.url).resolve('@sparticuz/chromium')), '..', '..', 'bin');
  if (!existsSync(join(folder, 'chromium'))) {
    // unpacked beside and moved, so that two test files starting together cannot see half of it
    const own = `${folder}.${process.pid}`;
    mkdirSync(own, { recursive: true });
    writeFileSync(join(own, 'chromium'), brotliDecompressSync(readFileSync(join(bin, 'chromium.br'))), { mode: 0o700 });
    for (const archive of ['al2023', 'fonts', 'swiftshader']) {
      const input = brotliDecompressSync(readFileSync(join(bin, `${archive}.tar.br`)));
      // the drawing libraries are looked for beside the program
      const to = archive === 'swiftshader' ? own : join(own, archive);
      mkdirSync(to, { recursive: true });
      execFileSync('tar', ['-x', '-C', to], { input });
    }
    try {
      renameSync(own, folder);
    } catch {
      rmSync(own, { recursive: true, force: true });
    }
  }
  return {
    executable: join(folder, 'chromium'),
    env: { LD_LIBRARY_PATH: join(folder, 'al2023', 'lib'), FONTCONFIG_PATH: join(folder, 'fonts') },
  };
}
