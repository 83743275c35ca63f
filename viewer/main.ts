/**
 * Starts the viewer: finds out what to show, opens it, and says plainly when the browser cannot draw it.
 */
import { html, render } from 'lit-html';
import { invented } from './data/invented.js';
import { NoWebGL2 } from './field/canvas.js';
import { App } from './screen/app.js';

const mount = document.getElementById('screen') as HTMLElement;

async function start(): Promise<void> {
  const q = new URLSearchParams(location.search);
  const app = new App(mount, invented(Number(q.get('invented') ?? 2000)));
  await app.start();
  (window as unknown as { rungsight: App }).rungsight = app;
}

start().catch((error: unknown) => {
  const says =
    error instanceof NoWebGL2
      ? 'This browser cannot draw the fields: Rungsight needs WebGL 2. A current Chrome, Edge, Firefox or Safari has it; it may be switched off in the settings.'
      : `The viewer could not start: ${error instanceof Error ? error.message : String(error)}`;
  render(html`<p class="failed" role="alert">${says}</p>`, mount);
  if (!(error instanceof NoWebGL2)) console.error(error);
});
