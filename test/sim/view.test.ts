/**
 * The server behind `view`: what it hands out, in which pieces, and what it refuses.
 */
import { mkdirSync, mkdtempSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import { request } from 'node:http';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { InputError } from '../../network/errors.js';
import { type RunningViewer, serveViewer } from '../../sim/command/view.js';

let root: string;
let served: RunningViewer;
const BYTES = Uint8Array.from({ length: 200_000 }, (_, k) => (k * 7) % 251);

beforeAll(async () => {
  root = mkdtempSync(join(tmpdir(), 'rungsight-view-'));
  mkdirSync(join(root, 'site', 'assets'), { recursive: true });
  writeFileSync(join(root, 'site', 'index.html'), '<!doctype html><title>viewer</title>');
  writeFileSync(join(root, 'site', 'assets', 'a.js'), 'export {};');
  mkdirSync(join(root, 'results'));
  writeFileSync(join(root, 'results', 'manifest.json'), '{}');
  writeFileSync(join(root, 'results', 'panel.parquet'), BYTES);
  writeFileSync(join(root, 'results', 'report.html'), '<style></style>');
  writeFileSync(join(root, 'results', '.secret'), 'no');
  writeFileSync(join(root, 'outside.txt'), 'no');
  symlinkSync(join(root, 'outside.txt'), join(root, 'results', 'link.txt'));
  served = await serveViewer({ dir: join(root, 'results'), site: join(root, 'site') });
});
afterAll(async () => {
  await served.close();
  rmSync(root, { recursive: true, force: true });
});

interface Answer {
  readonly status: number;
  readonly headers: Readonly<Record<string, string | string[] | undefined>>;
  readonly body: Buffer;
}

/** A request as written: no tidying of the path, any Host. */
function ask(path: string, headers: Record<string, string> = {}, method = 'GET'): Promise<Answer> {
  const { port } = new URL(served.url);
  return new Promise((done, failed) => {
    const sent = request({ host: '127.0.0.1', port, path, method, headers }, (answer) => {
      const parts: Buffer[] = [];
      answer.on('data', (part: Buffer) => parts.push(part));
      answer.on('end', () =>
        done({ status: answer.statusCode ?? 0, headers: answer.headers, body: Buffer.concat(parts) }),
      );
    });
    sent.on('error', failed);
    sent.end();
  });
}

describe('what is served', () => {
  test('listens on 127.0.0.1 only', () => {
    expect(new URL(served.url).hostname).toBe('127.0.0.1');
  });

  test('the page, its parts and the results, each with its type and the strict policy', async () => {
    for (const [path, type] of [
      ['/', 'text/html; charset=utf-8'],
      ['/assets/a.js', 'text/javascript; charset=utf-8'],
      ['/results/manifest.json', 'application/json; charset=utf-8'],
      ['/results/panel.parquet', 'application/vnd.apache.parquet'],
      ['/opened.json', 'application/json; charset=utf-8'],
    ]) {
      const { status, headers } = await ask(path);
      expect(status, path).toBe(200);
      expect(headers['content-type'], path).toBe(type);
      const policy = String(headers['content-security-policy']);
      expect(policy).toContain("default-src 'none'");
      expect(policy).toContain("script-src 'self'");
      expect(policy).not.toMatch(/unsafe-inline|unsafe-eval|https?:/);
      expect(headers['x-content-type-options']).toBe('nosniff');
    }
    expect(JSON.parse((await ask('/opened.json')).body.toString())).toMatchObject({ results: 'results/' });
  });

  test('the report may carry its own style, and no script', async () => {
    const policy = String((await ask('/results/report.html')).headers['content-security-policy']);
    expect(policy).toContain("style-src 'unsafe-inline'");
    expect(policy).not.toContain('script-src');
    expect(policy).toContain("default-src 'none'");
  });

  test.each([
    ['bytes=0-9', 0, 10],
    ['bytes=199990-', 199990, 200000],
    ['bytes=-8', 199992, 200000],
    ['bytes=100-99999999', 100, 200000],
    ['bytes=65536-131071', 65536, 131072],
  ])('a range %s', async (range, from, to) => {
    const { status, headers, body } = await ask('/results/panel.parquet', { Range: range });
    expect(status).toBe(206);
    expect(headers['content-range']).toBe(`bytes ${from}-${to - 1}/200000`);
    expect(headers['content-length']).toBe(String(to - from));
    expect(body.equals(Buffer.from(BYTES.subarray(from, to)))).toBe(true);
  });

  test('a range past the end is refused with the size', async () => {
    const { status, headers } = await ask('/results/panel.parquet', { Range: 'bytes=200000-' });
    expect(status).toBe(416);
    expect(headers['content-range']).toBe('bytes */200000');
  });

  test('HEAD gives the length and no body', async () => {
    const { status, headers, body } = await ask('/results/panel.parquet', {}, 'HEAD');
    expect(status).toBe(200);
    expect(headers['content-length']).toBe('200000');
    expect(headers['accept-ranges']).toBe('bytes');
    expect(body.length).toBe(0);
  });
});

describe('what is refused', () => {
  test.each([
    '/results/../outside.txt',
    '/results/%2e%2e/outside.txt',
    '/results/..%2foutside.txt',
    '/../outside.txt',
    '/results//etc/passwd',
    '/results/link.txt',
    '/results/.secret',
    '/results/',
    '/assets',
    '/results/no-such.csv',
    '/study/outside.txt',
    '/constructor/x',
  ])('%s is not there', async (path) => {
    const { status, body } = await ask(path);
    expect(status).toBe(404);
    expect(body.toString()).toBe('There is no such file.\n');
  });

  test('malformed addresses', async () => {
    expect((await ask('/%')).status).toBe(400);
    expect((await ask('/results/a%00b')).status).toBe(400);
  });

  test.each(['evil.example', '127.0.0.1', 'evil.example:80', '127.0.0.1.evil.example'])(
    'a page elsewhere that points the name %s here',
    async (host) => {
      expect((await ask('/results/panel.parquet', { Host: host })).status).toBe(421);
    },
  );

  test('writing', async () => {
    for (const method of ['POST', 'PUT', 'DELETE']) expect((await ask('/', {}, method)).status).toBe(405);
  });
});

describe('wrong requests', () => {
  const problem = async (options: Parameters<typeof serveViewer>[0]): Promise<string> => {
    try {
      await (await serveViewer(options)).close();
    } catch (error) {
      if (error instanceof InputError) return error.problems[0].code;
      throw error;
    }
    return 'served';
  };

  test('a folder that is not there, or holds no results; a study that is not there; a port that is taken', async () => {
    const site = join(root, 'site');
    expect(await problem({ site, dir: join(root, 'nowhere') })).toBe('not-found');
    expect(await problem({ site, dir: site })).toBe('not-results');
    expect(await problem({ site, study: join(root, 'no.yaml') })).toBe('not-found');
    expect(await problem({ site, port: Number(new URL(served.url).port) })).toBe('port-taken');
  });
});
