/**
 * Starts the viewer: finds out what to show, opens it, and says plainly when the browser cannot draw it.
 */
import { html, render } from 'lit-html';
import { figureStyle } from '../sim/results/figures/figure.js';
import { httpFiles } from './data/http.js';
import { openFolder } from './data/results.js';
import type { Source } from './data/source.js';
import { NoWebGL2 } from './field/canvas.js';
import { startRun } from './run/run.js';
import { App, type Origin } from './screen/app.js';
import { BUILT_IN, builtInFiles, DEFAULT_STUDY } from './sheet/built-in.js';

const mount = document.getElementById('screen') as HTMLElement;

/** What the server was asked to show; nothing on a plain file server. */
interface Opened {
  readonly results?: string;
  readonly study?: string;
}

async function opened(): Promise<Opened> {
  try {
    const answer = await fetch('opened.json');
    return answer.ok ? ((await answer.json()) as Opened) : {};
  } catch {
    return {};
  }
}

async function show(source: Source, origin: Origin): Promise<App> {
  const app = new App(mount, source, origin);
  // for tests and benches, which drive the page from outside
  Object.assign(window, { rungsight: app });
  await app.start();
  return app;
}

function wait(says: string): void {
  render(html`<p class="failed" role="status">${says}</p>`, mount);
}

async function start(): Promise<void> {
  const style = new CSSStyleSheet();
  style.replaceSync(figureStyle('page'));
  document.adoptedStyleSheets = [style];
  const asked = new URLSearchParams(location.search);
  const many = asked.get('invented');
  if (many !== null) {
    const { invented } = await import('./data/invented.js');
    await show(invented(Number(many)), { yaml: '', files: new Map(), linked: true });
    return;
  }
  wait('Opening …');
  const found = await opened();
  // a results folder beside a static build is named in the address: ?results=my-study
  const named = asked.get('results');
  const results = found.results ?? (named === null ? undefined : named.replace(/\/?$/, '/'));
  const { study } = found;
  if (results !== undefined) {
    const source = await openFolder(httpFiles(results), 'folder');
    const report = (await source.files()).includes('report.html') ? `${results}report.html` : null;
    await show(source, { yaml: source.info.yaml, files: new Map(), linked: true, report });
    return;
  }
  if (study !== undefined) {
    await runFirst(await (await fetch(study)).text(), await filesBeside(study), true);
    return;
  }
  const name = asked.get('study') ?? DEFAULT_STUDY;
  const builtIn = BUILT_IN.find((one) => one.name === name) ?? BUILT_IN[0];
  const texts = await builtInFiles(builtIn.text);
  const encoder = new TextEncoder();
  await runFirst(builtIn.text, new Map([...texts].map(([file, text]) => [file, encoder.encode(text)])), true);
}

/** Files a served study names, from its own folder. */
async function filesBeside(study: string): Promise<Map<string, Uint8Array>> {
  const { parseStudy } = await import('../sim/study/parse.js');
  const { filesOf } = await import('../sim/study/inputs.js');
  const files = new Map<string, Uint8Array>();
  const yaml = await (await fetch(study)).text();
  for (const { path } of filesOf(parseStudy(yaml, study).study)) {
    const answer = await fetch(new URL(path, new URL(study, document.baseURI)).href);
    if (answer.ok) files.set(path, new Uint8Array(await answer.arrayBuffer()));
  }
  return files;
}

/** Runs a study and shows it as soon as its first replicate is there. */
function runFirst(yaml: string, files: Map<string, Uint8Array>, linked: boolean): Promise<void> {
  return new Promise((done, failed) => {
    let app: Promise<App> | null = null;
    const origin: Origin = { yaml, files, linked };
    wait('Running the study …');
    const run = startRun(
      { yaml, files },
      {
        progress: (share, doing) => {
          if (app === null) wait(`Running the study: ${doing} …`);
          else void app.then((a) => a.progress(share, doing));
        },
        arrived: (source, _, whole) => {
          if (app === null) {
            app = show(source, origin).then((a) => {
              if (!whole) a.adopt(run);
              else a.finished();
              return a;
            });
            app.then(() => done(), failed);
          } else {
            void app.then(async (a) => {
              await a.open(source, origin, true);
              if (whole) a.finished();
            });
          }
        },
        problems: (problems) =>
          failed(new Error(problems.map((p) => `${p.place}: ${p.problem}; ${p.remedy}`).join('\n'))),
        failed: (message) => {
          if (app === null) failed(new Error(message));
          else void app.then((a) => a.failed(message));
        },
      },
    );
  });
}

start().catch((error: unknown) => {
  const says =
    error instanceof NoWebGL2
      ? 'This browser cannot draw the fields: Rungsight needs WebGL 2. A current Chrome, Edge, Firefox or Safari has it; it may be switched off in the settings.'
      : `The viewer could not start. ${error instanceof Error ? error.message : String(error)}`;
  render(html`<p class="failed" role="alert">${says}</p>`, mount);
  if (!(error instanceof NoWebGL2)) console.error(error);
});
