/**
 * The built viewer on a plain file server that knows neither byte ranges nor policies, in a folder of its own: a
 * built-in study runs in the page, and a results folder beside it opens.
 */
import { readFileSync } from 'node:fs';
import { createServer, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import { extname, join } from 'node:path';
import type { Browser, Page } from 'playwright-core';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { launch } from './chromium.js';
import { HAMLETS, type MadeResults, madeResults } from './results.js';
import { builtSite } from './site.js';

let server: Server;
let browser: Browser;
let made: MadeResults;
let base: string;

const TYPES: Readonly<Record<string, string>> = {
  '.html': 'text/html',
  '.js': 'text/javascript',
  '.css': 'text/css',
  '.svg': 'image/svg+xml',
};

beforeAll(async () => {
  const site = await builtSite();
  made = await madeResults(HAMLETS.replace('replicates: 3', 'replicates: 1'));
  server = createServer((request, response) => {
    const path = decodeURIComponent(new URL(request.url ?? '/', 'http://x').pathname);
    const inside = path.replace(/^\/pages\/rungs\//, '');
    const file = inside.startsWith('hamlets/')
      ? join(made.dir, inside.slice(8))
      : join(site, inside === '' ? 'index.html' : inside);
    try {
      const bytes = readFileSync(file);
      response.writeHead(200, {
        'Content-Type': TYPES[extname(file)] ?? 'application/octet-stream',
        'Content-Length': bytes.length,
      });
      response.end(request.method === 'HEAD' ? undefined : bytes);
    } catch {
      response.writeHead(404).end();
    }
  });
  await new Promise<void>((listening) => server.listen(0, '127.0.0.1', listening));
  base = `http://127.0.0.1:${(server.address() as AddressInfo).port}/pages/rungs/`;
  browser = await launch();
});
afterAll(async () => {
  await browser?.close();
  server?.closeAllConnections();
  await new Promise((done) => server?.close(done));
  made?.remove();
});

async function opened(address: string): Promise<{ page: Page; complaints: string[] }> {
  const page = await (await browser.newContext({ viewport: { width: 1280, height: 800 } })).newPage();
  const complaints: string[] = [];
  page.on('console', (m) => {
    // the page asks whether a server of ours is there; a plain one answers 404, and the browser notes it
    if (['error', 'warning'].includes(m.type()) && !m.location().url.endsWith('opened.json')) complaints.push(m.text());
  });
  page.on('pageerror', (e) => complaints.push(String(e)));
  await page.goto(`${base}${address}`);
  await page.waitForFunction(() => window.rungsight?.scene != null, null, { timeout: 100_000 });
  return { page, complaints };
}

test('a built-in study runs to its first result', async () => {
  const { page, complaints } = await opened('?study=city-tight');
  expect(await page.locator('h1').innerText()).toMatch(/city/i);
  expect(await page.locator('.guide').innerText()).toContain('predicts no family');
  expect(await page.locator('.summary').innerText()).toMatch(/^Generation \d+: /);
  expect(complaints).toEqual([]);
  await page.context().close();
});

test('a results folder beside it opens', async () => {
  const { page, complaints } = await opened('?results=hamlets#generation=2');
  expect(await page.locator('h1').innerText()).toBe('Twenty hamlets');
  expect(await page.locator('.summary').innerText()).toContain('Generation 2');
  expect(complaints).toEqual([]);
  await page.context().close();
});
