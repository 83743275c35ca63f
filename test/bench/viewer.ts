/**
 * Frame budget of the viewer, printed: headless Chromium drawing in software, on invented households.
 *
 *     npm run build:viewer && npm run bench:viewer
 *
 * Playing is timed over whole glides between generations, ties shown; interaction is the time from an input to the
 * frame that answers it, the card waited for. Figures are medians; aims are those the viewer was made to.
 */
import { cpus } from 'node:os';
import type { Page } from 'playwright-core';
import type { App } from '../../viewer/screen/app.js';
import { launch } from '../browser/chromium.js';
import { servedSite } from '../browser/site.js';

declare global {
  interface Window {
    rungsight: App;
  }
}

const site = await servedSite({});
const browser = await launch();

async function open(n: number): Promise<{ page: Page; seconds: number }> {
  const context = await browser.newContext({ viewport: { width: 1280, height: 800 } });
  await context.addInitScript(() => {
    localStorage.setItem('rungsight guide', 'seen');
    localStorage.setItem('rungsight caution Invented villages', 'shown');
  });
  // the runner's transpiler names inner functions through a helper the page does not have
  await context.addInitScript('globalThis.__name = (f) => f');
  const page = await context.newPage();
  const began = performance.now();
  await page.goto(`${site.url}?invented=${n}#generation=1&ties=shown`);
  await page.waitForFunction(() => window.rungsight?.scene != null && window.rungsight.stage !== null, null, {
    timeout: 300_000,
  });
  return { page, seconds: (performance.now() - began) / 1000 };
}

/** Frames a second while marks glide from generation to generation, and the slowest frame in milliseconds. */
async function playing(page: Page): Promise<{ rate: number; worst: number; ties: number }> {
  return page.evaluate(async () => {
    const app = window.rungsight;
    const times: number[] = [];
    for (const generation of [2, 3, 4, 5, 6]) {
      await app.change({ generation });
      // the first glide warms up and finds how many ties fit the budget
      let last = performance.now();
      while (app.stage?.busy) {
        await new Promise((next) => requestAnimationFrame(next));
        app.stage?.settle();
        const now = performance.now();
        if (generation > 2) times.push(now - last);
        last = now;
      }
    }
    times.sort((a, b) => a - b);
    const middle = times[Math.floor(times.length / 2)];
    return {
      rate: 1000 / middle,
      worst: times[Math.floor(times.length * 0.95)],
      ties: app.stage?.tiesWhileMoving ?? 0,
    };
  });
}

/** Milliseconds from an input to the drawn answer. */
async function interacting(page: Page): Promise<{ pan: number; zoom: number; hover: number; select: number }> {
  return page.evaluate(async () => {
    const app = window.rungsight;
    const stage = app.stage;
    const field = stage?.root.querySelector('.field-left') as HTMLElement;
    const box = field.getBoundingClientRect();
    const [x, y] = [box.left + box.width / 2, box.top + box.height / 2];
    const median = (list: number[]): number => list.sort((a, b) => a - b)[Math.floor(list.length / 2)];
    const drawn = async (): Promise<void> => {
      await new Promise((next) => requestAnimationFrame(next));
      stage?.settle();
    };
    const timed = async (times: number, act: (k: number) => void): Promise<number> => {
      const list: number[] = [];
      for (let k = 0; k < times; k++) {
        const began = performance.now();
        act(k);
        await drawn();
        list.push(performance.now() - began);
        await new Promise((next) => setTimeout(next, 20));
      }
      return median(list);
    };
    const event = (type: string, dx = 0, dy = 0): PointerEvent =>
      new PointerEvent(type, { clientX: x + dx, clientY: y + dy, bubbles: true, pointerId: 1, button: 0, buttons: 1 });
    const zoom = await timed(12, () =>
      field.dispatchEvent(
        new WheelEvent('wheel', { clientX: x, clientY: y, deltaY: -60, bubbles: true, cancelable: true }),
      ),
    );
    const real = field.setPointerCapture;
    field.setPointerCapture = () => {};
    field.dispatchEvent(event('pointerdown'));
    const pan = await timed(12, (k) => field.dispatchEvent(event('pointermove', 8 * (k + 1), 5 * (k + 1))));
    field.dispatchEvent(event('pointercancel'));
    field.setPointerCapture = real;
    stage?.wholeField();
    await new Promise((next) => setTimeout(next, 900));
    const hover = await timed(12, (k) => field.dispatchEvent(event('pointermove', 9 * k - 50, 4 * k - 20)));
    const select = await timed(5, (k) => app.select(100 + 7 * k));
    return { pan, zoom, hover, select };
  });
}

const ms = (v: number): string => `${v.toFixed(v < 10 ? 1 : 0)} ms`;
console.log(`viewer, headless Chromium with software rendering, ${cpus().length} × ${cpus()[0].model}\n`);
const aims: Record<number, string> = {
  2000: '30 frames a second while playing',
  50000: 'pan, zoom, hover under 100 ms',
};
for (const n of [2000, 10000, 50000]) {
  const { page, seconds } = await open(n);
  const play = await playing(page);
  const act = await interacting(page);
  console.log(
    `2 × ${n.toLocaleString('en')} households: playing ${play.rate.toFixed(0)} frames a second (slow frames ${ms(play.worst)}, ` +
      `${Math.round(play.ties).toLocaleString('en')} ties a field), pan ${ms(act.pan)}, zoom ${ms(act.zoom)}, hover ${ms(act.hover)}, ` +
      `select ${ms(act.select)}, ready in ${seconds.toFixed(1)} s${aims[n] === undefined ? '' : `   [aim: ${aims[n]}]`}`,
  );
  await page.context().close();
}
await browser.close();
await site.close();
