/**
 * The built viewer for tests: dist/viewer where it is newer than its sources, else built first.
 */
import { existsSync, readdirSync, statSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { build } from 'vite';
import { type RunningViewer, serveViewer, type ViewerOptions } from '../../sim/command/view.js';

const top = fileURLToPath(new URL('../..', import.meta.url));
const site = join(top, 'dist', 'viewer');

function newest(folder: string): number {
  let latest = 0;
  for (const entry of readdirSync(folder, { withFileTypes: true, recursive: true })) {
    if (entry.isFile()) latest = Math.max(latest, statSync(join(entry.parentPath, entry.name)).mtimeMs);
  }
  return latest;
}

/** Folder of the built viewer. */
export async function builtSite(): Promise<string> {
  const made = join(site, 'index.html');
  const sources = ['viewer', 'sim', 'network', 'presets'].map((folder) => newest(join(top, folder)));
  if (!existsSync(made) || statSync(made).mtimeMs < Math.max(...sources)) {
    // libraries ship a noisy development build, which the test runner's environment would choose
    const environment = process.env.NODE_ENV;
    process.env.NODE_ENV = 'production';
    await build({ configFile: join(top, 'viewer', 'vite.config.ts'), logLevel: 'error' });
    process.env.NODE_ENV = environment;
  }
  return site;
}

/** Serves the viewer as `rungsight view` does. */
export async function servedSite(options: Omit<ViewerOptions, 'site'>): Promise<RunningViewer> {
  return serveViewer({ ...options, site: await builtSite() });
}
