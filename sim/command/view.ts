/**
 * `rungsight view`: serves the viewer, and a results folder or a study, on 127.0.0.1 to this machine's browser only.
 *
 * Files are read where they lie, by byte range, and never outside the folders given. The Host header is checked, so
 * that a page elsewhere cannot reach the folder through a name that points here. Nothing is ever written.
 */
import { createReadStream, existsSync, readFileSync, realpathSync, statSync } from 'node:fs';
import { createServer, type IncomingMessage, type Server, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';
import { basename, dirname, extname, join, resolve, sep } from 'node:path';
import { fileURLToPath } from 'node:url';
import type { Command } from 'commander';
import { InputError } from '../../network/errors.js';
import { studyFile } from './study-files.js';

export interface ViewerOptions {
  /** A results folder. */
  readonly dir?: string;
  /** A study file, run in the page. */
  readonly study?: string;
  /** 0 or absent: any free port. */
  readonly port?: number;
  /** The built viewer; found beside the program when absent. */
  readonly site?: string;
}

export interface RunningViewer {
  readonly url: string;
  close(): Promise<void>;
}

const TYPES: Readonly<Record<string, string>> = {
  '.html': 'text/html; charset=utf-8',
  '.js': 'text/javascript; charset=utf-8',
  '.css': 'text/css; charset=utf-8',
  '.svg': 'image/svg+xml',
  '.json': 'application/json; charset=utf-8',
  '.yaml': 'text/plain; charset=utf-8',
  '.yml': 'text/plain; charset=utf-8',
  '.md': 'text/plain; charset=utf-8',
  '.csv': 'text/csv; charset=utf-8',
  '.woff2': 'font/woff2',
  '.woff': 'font/woff',
  '.png': 'image/png',
  '.parquet': 'application/vnd.apache.parquet',
  '.graphml': 'application/xml; charset=utf-8',
};

const POLICY =
  "default-src 'none'; script-src 'self'; worker-src 'self'; style-src 'self'; font-src 'self'; " +
  "img-src 'self' data: blob:; connect-src 'self'; base-uri 'none'; form-action 'none'; frame-ancestors 'none'";
/** The engine's worker may compile its inner loops (WebAssembly); still no script from a text. */
const WORKER_POLICY = POLICY.replace("script-src 'self'", "script-src 'self' 'wasm-unsafe-eval'");
/** The report is one page with its own style and no script. */
const REPORT_POLICY =
  "default-src 'none'; style-src 'unsafe-inline'; img-src data:; font-src data:; base-uri 'none'; form-action 'none'; frame-ancestors 'none'";

/**
 * Serves until closed.
 *
 * `/` is the viewer, `/results/…` the results folder, `/study/…` the study file and what lies in its folder, and
 * `/opened.json` says which of the two there is.
 *
 * @throws {InputError} when the folder or the study is not there, or the viewer has not been built
 */
export async function serveViewer(options: ViewerOptions): Promise<RunningViewer> {
  const site = options.site ?? findSite();
  const roots: Record<string, string> = {};
  let opened: Record<string, string> = {};
  if (options.dir !== undefined) {
    const dir = existing(options.dir, 'results folder');
    if (!existsSync(join(dir, 'manifest.json')))
      throw new InputError({
        code: 'not-results',
        place: options.dir,
        problem: 'has no manifest.json, so it is not a results folder',
        remedy: 'give the folder that `rungsight run STUDY --out DIR` wrote',
      });
    roots.results = dir;
    opened = { results: 'results/', name: basename(dir) };
  } else if (options.study !== undefined) {
    const file = existing(options.study, 'study file');
    roots.study = dirname(file);
    opened = { study: `study/${encodeURIComponent(basename(file))}`, name: basename(file) };
  }
  const server = createServer((request, response) => {
    try {
      answer(request, response, site, roots, opened);
    } catch {
      refuse(response, 500, 'The file could not be read.');
    }
  });
  await listen(server, options.port ?? 0);
  const { port } = server.address() as AddressInfo;
  return {
    url: `http://127.0.0.1:${port}/`,
    close: () =>
      new Promise((done) => {
        server.closeAllConnections();
        server.close(() => done());
      }),
  };
}

function listen(server: Server, port: number): Promise<void> {
  return new Promise((done, failed) => {
    server.once('error', (error: NodeJS.ErrnoException) => {
      failed(
        error.code === 'EADDRINUSE' || error.code === 'EACCES'
          ? new InputError({
              code: 'port-taken',
              place: '--port',
              problem: `port ${port} cannot be used (${error.code})`,
              remedy: 'give another port, or leave --port out to take any free one',
            })
          : error,
      );
    });
    server.listen(port, '127.0.0.1', () => done());
  });
}

function existing(path: string, what: string): string {
  if (!existsSync(path))
    throw new InputError({
      code: 'not-found',
      place: path,
      problem: `there is no such ${what}`,
      remedy: 'check the path',
    });
  return realpathSync(path);
}

/** The built viewer, from the compiled program and from the sources alike. */
function findSite(): string {
  const here = dirname(fileURLToPath(import.meta.url));
  for (const candidate of ['../../viewer', '../../dist/viewer']) {
    const site = resolve(here, candidate);
    // the sources have an index.html too: only the built one has assets
    if (existsSync(join(site, 'index.html')) && existsSync(join(site, 'assets'))) return realpathSync(site);
  }
  throw new InputError({
    code: 'viewer-not-built',
    place: 'viewer',
    problem: 'the viewer has not been built',
    remedy: 'run `npm run build:viewer` in the checkout',
  });
}

function answer(
  request: IncomingMessage,
  response: ServerResponse,
  site: string,
  roots: Readonly<Record<string, string>>,
  opened: Readonly<Record<string, string>>,
): void {
  const port = request.socket.localPort;
  const host = request.headers.host;
  if (host !== `127.0.0.1:${port}` && host !== `localhost:${port}`)
    return void refuse(response, 421, 'This address is not served here.');
  if (request.method !== 'GET' && request.method !== 'HEAD') {
    response.setHeader('Allow', 'GET, HEAD');
    return void refuse(response, 405, 'Only reading is possible.');
  }
  let path: string;
  try {
    path = decodeURIComponent((request.url ?? '/').split('?', 1)[0]);
  } catch {
    return void refuse(response, 400, 'The address is malformed.');
  }
  if (path.includes('\0')) return void refuse(response, 400, 'The address is malformed.');
  if (path === '/opened.json') {
    const body = JSON.stringify(opened);
    head(response, 200, TYPES['.json'], POLICY);
    response.setHeader('Content-Length', Buffer.byteLength(body));
    response.end(request.method === 'HEAD' ? undefined : body);
    return;
  }
  const [, first, ...rest] = path.split('/');
  const root = Object.hasOwn(roots, first) ? roots[first] : site;
  const inside = root === site ? path.slice(1) || 'index.html' : rest.join('/');
  const file = within(root, inside);
  if (file === null) return void refuse(response, 404, 'There is no such file.');
  const name = basename(file);
  const policy =
    root !== site && name === 'report.html' ? REPORT_POLICY : name.startsWith('engine.worker') ? WORKER_POLICY : POLICY;
  send(request, response, file, policy);
}

/** The real path of a file inside a root, or null: links that lead outside count as absent. */
function within(root: string, path: string): string | null {
  const wanted = resolve(root, path);
  if (!wanted.startsWith(root + sep) || path.split('/').some((part) => part.startsWith('.'))) return null;
  let real: string;
  try {
    real = realpathSync(wanted);
  } catch {
    return null;
  }
  return real.startsWith(root + sep) && statSync(real).isFile() ? real : null;
}

function send(request: IncomingMessage, response: ServerResponse, file: string, policy: string): void {
  const { size } = statSync(file);
  const range = /^bytes=(\d*)-(\d*)$/.exec(request.headers.range ?? '');
  let from = 0;
  let to = size - 1;
  if (range !== null && (range[1] !== '' || range[2] !== '')) {
    if (range[1] === '') from = Math.max(0, size - Number(range[2]));
    else {
      from = Number(range[1]);
      if (range[2] !== '') to = Math.min(to, Number(range[2]));
    }
    if (from > to || from >= size) {
      response.setHeader('Content-Range', `bytes */${size}`);
      return void refuse(response, 416, 'The file is shorter than that.');
    }
    head(response, 206, TYPES[extname(file)] ?? 'application/octet-stream', policy);
    response.setHeader('Content-Range', `bytes ${from}-${to}/${size}`);
  } else {
    head(response, 200, TYPES[extname(file)] ?? 'application/octet-stream', policy);
  }
  response.setHeader('Accept-Ranges', 'bytes');
  response.setHeader('Content-Length', Math.max(0, to - from + 1));
  if (request.method === 'HEAD' || size === 0) {
    response.end();
    return;
  }
  // small files whole: no stream left open when the reader goes away
  if (to - from < 65536 && from === 0 && to === size - 1) {
    response.end(readFileSync(file));
    return;
  }
  const stream = createReadStream(file, { start: from, end: to });
  stream.on('error', () => response.destroy());
  response.on('close', () => stream.destroy());
  stream.pipe(response);
}

function head(response: ServerResponse, status: number, type: string, policy: string): void {
  response.statusCode = status;
  response.setHeader('Content-Type', type);
  response.setHeader('Content-Security-Policy', policy);
  response.setHeader('X-Content-Type-Options', 'nosniff');
  response.setHeader('Referrer-Policy', 'no-referrer');
  response.setHeader('Cross-Origin-Resource-Policy', 'same-origin');
  response.setHeader('Cross-Origin-Opener-Policy', 'same-origin');
  response.setHeader('Cache-Control', 'no-cache');
}

function refuse(response: ServerResponse, status: number, says: string): void {
  if (response.headersSent) {
    response.destroy();
    return;
  }
  head(response, status, 'text/plain; charset=utf-8', POLICY);
  response.end(`${says}\n`);
}

/** Adds `view` to the program. */
export function viewCommand(program: Command): void {
  program
    .command('view')
    .description('watch a results folder or a study in the browser')
    .argument(
      '[DIR or STUDY]',
      'a results folder, or a study (a file, or a built-in one by name) to run in the page; without it the first built-in',
    )
    .option('--port <number>', 'port on 127.0.0.1 (any free one)')
    .addHelpText('after', '\nExample:\n  rungsight view results/villages-apart')
    .action(async (path: string | undefined, flags: { port?: string }) => {
      const port = flags.port === undefined ? 0 : Number(flags.port);
      if (!Number.isInteger(port) || port < 0 || port > 65535)
        throw new InputError({
          code: 'bad-port',
          place: '--port',
          problem: `${flags.port} is not a port`,
          remedy: 'give a whole number from 0 to 65535',
        });
      let what: { dir?: string; study?: string } = {};
      if (path !== undefined)
        what = statSync(path, { throwIfNoEntry: false })?.isDirectory()
          ? { dir: path }
          : { study: existing(studyFile(path), 'folder or study file') };
      const viewer = await serveViewer({ ...what, port });
      console.log(`The viewer is at ${viewer.url} (Ctrl-C ends it)`);
      await new Promise<void>((done) => {
        process.once('SIGINT', () => done());
        process.once('SIGTERM', () => done());
      });
      await viewer.close();
    });
}
