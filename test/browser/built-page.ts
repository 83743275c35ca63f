/**
 * Builds a page of test/browser/pages as the viewer is built and serves it on 127.0.0.1 under the viewer's content
 * security policy, so that what works here works in the product.
 */
import { mkdtempSync, readFileSync, rmSync, statSync } from 'node:fs';
import { createServer } from 'node:http';
import type { AddressInfo } from 'node:net';
import { tmpdir } from 'node:os';
import { extname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { build } from 'vite';

const POLICY =
  "default-src 'none'; script-src 'self'; worker-src 'self'; style-src 'self'; font-src 'self'; " +
  "img-src 'self' data: blob:; connect-src 'self'; base-uri 'none'; form-action 'none'; frame-ancestors 'none'";

const TYPES: Readonly<Record<string, string>> = {
  '.html': 'text/html; charset=utf-8',
  '.js': 'text/javascript; charset=utf-8',
  '.css': 'text/css; charset=utf-8',
  '.svg': 'image/svg+xml',
  '.woff2': 'font/woff2',
  '.woff': 'font/woff',
};

export interface BuiltPage {
  readonly url: string;
  close(): Promise<void>;
}

/** @param name - `NAME.html` in test/browser/pages */
export async function builtPage(name: string): Promise<BuiltPage> {
  const root = fileURLToPath(new URL('pages', import.meta.url));
  const outDir = mkdtempSync(join(tmpdir(), 'rungsight-page-'));
  // libraries ship a noisy development build, which the test runner's environment would choose
  const environment = process.env.NODE_ENV;
  process.env.NODE_ENV = 'production';
  await build({
    root,
    base: './',
    configFile: false,
    publicDir: false,
    logLevel: 'error',
    worker: { format: 'es' },
    build: {
      outDir,
      emptyOutDir: true,
      target: 'es2022',
      assetsInlineLimit: 0,
      minify: false,
      modulePreload: { polyfill: false },
      rolldownOptions: { input: join(root, `${name}.html`) },
    },
  });
  process.env.NODE_ENV = environment;
  const server = createServer((request, response) => {
    const path = decodeURIComponent(new URL(request.url ?? '/', 'http://x').pathname);
    const file = join(outDir, path === '/' ? `${name}.html` : path);
    try {
      if (!file.startsWith(outDir) || !statSync(file).isFile()) throw new Error('not here');
      response.writeHead(200, {
        'Content-Type': TYPES[extname(file)] ?? 'application/octet-stream',
        'Content-Security-Policy': POLICY,
      });
      response.end(readFileSync(file));
    } catch {
      response.writeHead(404).end();
    }
  });
  await new Promise<void>((listening) => server.listen(0, '127.0.0.1', listening));
  return {
    url: `http://127.0.0.1:${(server.address() as AddressInfo).port}/`,
    close: async () => {
      server.closeAllConnections();
      await new Promise((done) => server.close(done));
      rmSync(outDir, { recursive: true, force: true });
    },
  };
}
