/**
 * The screen on a results folder, in a real browser: what a reader does, and what must hold while it is done.
 */
import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { createRequire } from 'node:module';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { unzipSync } from 'fflate';
import type { Browser, BrowserContextOptions, Page } from 'playwright-core';
import { SaxesParser } from 'saxes';
import { afterAll, afterEach, beforeAll, describe, expect, test } from 'vitest';
import type { RunningViewer } from '../../sim/command/view.js';
import type { App } from '../../viewer/screen/app.js';
import { launch } from './chromium.js';
import { HAMLETS, type MadeResults, madeResults, SEPARATED } from './results.js';
import { servedSite } from './site.js';

declare global {
  interface Window {
    rungsight: App;
  }
}

let browser: Browser;
let made: MadeResults;
let served: RunningViewer;
let page: Page;
let complaints: string[] = [];
let strangers: string[] = [];
let ranges: string[] = [];

beforeAll(async () => {
  made = await madeResults(HAMLETS);
  [browser, served] = await Promise.all([launch(), servedSite({ dir: made.dir })]);
});
afterAll(async () => {
  await browser?.close();
  await served?.close();
  made?.remove();
});
afterEach(async () => {
  await page?.context().close();
  expect(complaints, 'nothing is refused or goes wrong unseen').toEqual([]);
  expect(strangers, 'no request leaves this machine').toEqual([]);
});

const SIZE = { width: 1280, height: 800 };

/** Opens the folder; by default the walk-through has been dismissed before. */
async function open(hash: string, options: BrowserContextOptions = {}, fresh = false, url = served.url): Promise<void> {
  complaints = [];
  strangers = [];
  ranges = [];
  const context = await browser.newContext({ viewport: SIZE, colorScheme: 'light', acceptDownloads: true, ...options });
  if (!fresh) {
    await context.addInitScript(() => {
      // the empty page between two has no storage
      if (location.protocol !== 'http:') return;
      localStorage.setItem('rungsight guide', 'seen');
      for (const title of ['Twenty hamlets', 'Two peoples'])
        localStorage.setItem(`rungsight caution ${title}`, 'shown');
    });
  }
  page = await context.newPage();
  page.on('console', (m) => {
    if (['error', 'warning'].includes(m.type()) && !m.text().includes('GPU stall')) complaints.push(m.text());
  });
  page.on('pageerror', (e) => complaints.push(String(e)));
  page.on('request', (r) => {
    const url = new URL(r.url());
    if (['http:', 'https:', 'ws:', 'wss:'].includes(url.protocol) && url.hostname !== '127.0.0.1')
      strangers.push(r.url());
    const range = r.headers().range;
    if (range !== undefined) ranges.push(`${url.pathname} ${range}`);
  });
  await page.goto(`${url}${hash}`);
  await shown();
}

/** Waits until a scene is drawn and at rest. */
async function shown(): Promise<void> {
  await page.waitForFunction(() => {
    const app = window.rungsight;
    return app?.scene != null && app.stage !== null && !app.stage.busy && app.scene.generation === app.view.generation;
  });
}

const summary = (): Promise<string> => page.locator('.summary').innerText();
const view = (): Promise<App['view']> => page.evaluate(() => window.rungsight.view);

/** Households of the left field at the generation shown, by status and cause. */
async function find(cause: 'local' | 'general' | 'satisfied'): Promise<number> {
  const i = await page.evaluate((wanted) => {
    const now = window.rungsight.scene?.arms[0].now;
    if (now === undefined) return -1;
    for (let k = 0; k < now.met.length; k++) {
      if (wanted === 'satisfied' ? now.met[k] > 0 : now.met[k] === 0 && now.cause[k] === (wanted === 'local' ? 1 : 2))
        return k;
    }
    return -1;
  }, cause);
  expect(i).toBeGreaterThanOrEqual(0);
  return i;
}

describe('opening', () => {
  test('shows the cautions and the walk-through once, and never again when told so', async () => {
    await open('', {}, true);
    const guide = page.locator('.guide');
    expect(await guide.innerText()).toContain('predicts no family');
    for (let k = 0; k < 4; k++) await guide.getByRole('button', { name: 'Next' }).click();
    await guide.getByRole('button', { name: 'Done' }).click();
    expect(await guide.count()).toBe(0);
    await page.reload();
    await shown();
    expect(await guide.count()).toBe(0);
  });

  test('says the generation shown in a live sentence that agrees with the results', async () => {
    await open('#generation=3');
    const said = await summary();
    const rows = new TextDecoder().decode(made.files.get('indicators.csv')).split(/\r?\n/);
    const at = rows[0].split(',').indexOf('share_frustrated');
    const share = (arm: string): number =>
      Math.round(100 * Number(rows.find((row) => row.startsWith(`${arm},0,3,`))?.split(',')[at]));
    expect(said.replaceAll('\u202f', ' ')).toContain(
      `Generation 3: ${share('apart')} % frustrated in apart, ${share('mixed')} % in mixed`,
    );
    expect(await page.locator('.summary').getAttribute('aria-live')).toBe('polite');
  });

  test('reads the panel by byte range, and not the whole of it', async () => {
    await open('#generation=3');
    const panel = ranges.filter((r) => r.startsWith('/results/panel.parquet'));
    expect(panel.length).toBeGreaterThan(0);
    let bytes = 0;
    for (const r of panel) {
      const [, from, to] = /bytes=(\d+)-(\d+)/.exec(r) ?? [];
      bytes += Number(to) - Number(from) + 1;
    }
    const size = made.files.get('panel.parquet')?.length ?? 0;
    // one replicate of three, and of its columns those the screen shows
    expect(bytes).toBeLessThan(0.5 * size);
  });

  test('says plainly that it needs WebGL 2 where there is none', async () => {
    complaints = [];
    const context = await browser.newContext({ viewport: SIZE });
    await context.addInitScript(() => {
      HTMLCanvasElement.prototype.getContext = (() => null) as never;
    });
    page = await context.newPage();
    await page.goto(served.url);
    const alert = page.locator('.failed[role=alert]');
    await alert.waitFor();
    expect(await alert.innerText()).toContain('WebGL 2');
  });
});

describe('time', () => {
  test('plays through the generations and stops at the last', async () => {
    await open('#generation=4');
    await page.getByRole('button', { name: /play/ }).click();
    await page.waitForFunction(() => window.rungsight.view.generation === 5);
    expect(await page.evaluate(() => window.rungsight.playing)).toBe(true);
    await page.waitForFunction(() => !window.rungsight.playing);
    await shown();
    expect((await view()).generation).toBe(6);
    expect(await summary()).toContain('last children');
  });

  test('goes where the strip is clicked, and marks glide there', async () => {
    await open('#generation=1');
    const box = await page.locator('.strip-bars').boundingBox();
    if (box === null) throw new Error('no strip');
    await page.mouse.click(box.x + (4.5 / 7) * box.width, box.y + box.height / 2);
    await page.waitForFunction(() => window.rungsight.scene?.generation === 4);
    // caught on the way, or there already on a slow machine: either way it arrives
    await shown();
    expect((await view()).generation).toBe(4);
  });

  test('does not move for a reader who prefers reduced motion', async () => {
    await open('#generation=1', { reducedMotion: 'reduce' });
    const glides = await page.evaluate(async () => {
      await window.rungsight.change({ generation: 2 });
      return window.rungsight.stage?.glide;
    });
    expect(glides).toBe(1);
  });
});

describe('a household', () => {
  test('is selected by a click on its mark, in both fields, and named in the link', async () => {
    await open('#generation=3');
    const i = await find('local');
    const at = await page.evaluate((household) => {
      const stage = window.rungsight.stage;
      const box = stage?.root.getBoundingClientRect();
      const p = stage?.positionOf(household, 0);
      return { x: (box?.left ?? 0) + (p?.x ?? 0), y: (box?.top ?? 0) + (p?.y ?? 0) };
    }, i);
    await page.mouse.click(at.x, at.y);
    await page.waitForFunction(() => window.rungsight.scene?.selected !== -1);
    const { household } = await view();
    // marks may touch: the one picked is the one clicked or lies under the same pointer
    const picked = await page.evaluate((h) => window.rungsight.stage?.positionOf(h ?? 0, 0), household);
    const asked = await page.evaluate((h) => window.rungsight.stage?.positionOf(h, 0), i);
    expect(Math.hypot((picked?.x ?? 0) - (asked?.x ?? 99), (picked?.y ?? 0) - (asked?.y ?? 99))).toBeLessThan(3);
    expect(page.url()).toContain(`household=${household}`);
    expect(await page.locator('svg.over .self').count()).toBe(2);
    expect(await page.locator('#tab-household').innerText()).toBe(`Household ${household}`);
  });

  test('what if: the engine agrees with the cause in the results', async () => {
    await open('#generation=3');
    for (const [cause, says] of [
      ['local', 'local cause'],
      ['general', 'general cause'],
    ] as const) {
      const i = await find(cause);
      await page.evaluate((k) => window.rungsight.change({ household: k }), i);
      await page.waitForFunction((k) => window.rungsight.scene?.selected === k, i);
      expect(await page.locator('.what-if').innerText()).toContain(says);
      expect(await page.locator('.what-if').innerText()).not.toContain('the results say otherwise');
    }
    const text = await page.locator('.what-if').innerText();
    expect(text).toContain('As in mixed');
  });

  test('is found by its number, and a wrong number is answered', async () => {
    await open('#generation=3');
    const input = page.locator('.find input');
    await input.fill('412');
    await input.press('Enter');
    await page.waitForFunction(() => window.rungsight.view.household === 412);
    expect(await page.locator('figure.shown').count()).toBe(3);
    await input.fill('99999');
    await input.press('Enter');
    expect(await page.locator('.message').innerText()).toContain('no household 99999');
  });

  test('shows both arms’ lines of descent on request', async () => {
    await open('#generation=3&household=20');
    const heading = page.locator('figure.shown figcaption span').first();
    await heading.waitFor();
    expect(await heading.innerText()).toMatch(/^Line of descent in apart \((shore|hill), place \d+\)$/);
    await page.getByRole('radio', { name: 'mixed' }).click();
    await page.waitForFunction(() =>
      document.querySelector('figure.shown figcaption span')?.textContent?.includes('mixed'),
    );
  });
});

describe('pockets', () => {
  test('only those that are more than chance are tinted; all are listed; a click frames', async () => {
    await open('#generation=2&tab=pockets');
    const rows = page.locator('.pockets tbody tr');
    await rows.first().waitFor();
    const listed = await rows.count();
    const chance = await page.locator('.pockets tbody tr.chance').count();
    const tinted = await page.evaluate(() => {
      const arms = window.rungsight.scene?.arms ?? [];
      return arms.reduce((sum, a) => sum + a.pockets.length, 0);
    });
    expect(listed - chance).toBe(tinted);
    expect(listed).toBeGreaterThan(0);
    // from far away: zoomed in on a corner
    await page.evaluate(() => {
      for (let k = 0; k < 5; k++) window.rungsight.stage?.zoom(1.5);
    });
    await page.waitForFunction(() => (window.rungsight.stage?.camera.zoom ?? 1) > 5 && !window.rungsight.stage?.busy);
    await rows.last().locator('.row-button').click();
    await page.waitForFunction(() => window.rungsight.view.pocket !== null && !window.rungsight.stage?.busy);
    await page.waitForFunction(() => {
      const { stage, scene, view } = window.rungsight;
      if (stage === null || scene === null || view.pocket === null || stage.busy) return false;
      const { field, id } = view.pocket;
      const { now } = scene.arms[field];
      const frame = stage.root.querySelector(field === 0 ? '.field-left' : '.field-right')?.getBoundingClientRect();
      const origin = stage.root.getBoundingClientRect();
      let inside = 0;
      for (let i = 0; i < now.pocket.length; i++) {
        if (now.pocket[i] !== id || now.role[i] !== 2) continue;
        const p = stage.positionOf(i, field);
        const [x, y] = [origin.left + p.x, origin.top + p.y];
        if (frame === undefined || x < frame.left || x > frame.right || y < frame.top || y > frame.bottom) return false;
        inside++;
      }
      return inside >= 5;
    });
  });

  test('sort by any column', async () => {
    await open('#generation=3&tab=pockets');
    await page.locator('.pockets tbody tr').first().waitFor();
    const sizes = async (): Promise<number[]> =>
      (await page.locator('.pockets tbody tr td:nth-child(2)').allInnerTexts()).map(Number);
    expect(await sizes()).toEqual([...(await sizes())].sort((a, b) => b - a));
    await page.getByRole('button', { name: /core/ }).click();
    expect(await sizes()).toEqual([...(await sizes())].sort((a, b) => a - b));
  });
});

describe('arrangements', () => {
  test('the map does not overstate segregation, separated or mixed', async () => {
    const two = await madeResults(SEPARATED);
    const other = await servedSite({ dir: two.dir });
    try {
      await open('#generation=1&arrangement=map', {}, false, other.url);
      await page.waitForFunction(() => window.rungsight.scene?.arms.every((a) => a.map !== null));
      const prints = await page.evaluate(() => window.rungsight.scene?.arms.map((a) => a.print));
      const shares = prints?.map((print) => [...(print ?? '').matchAll(/(\d+)\s%/g)].map((m) => Number(m[1]))) ?? [];
      expect(shares.length).toBe(2);
      for (const [drawn, tied] of shares) expect(Math.abs(drawn - tied)).toBeLessThanOrEqual(10);
      // the two networks differ by far more than the drawing may err
      expect(shares[0][1] - shares[1][1]).toBeGreaterThan(25);
      await page.waitForFunction(() => document.querySelector('.field-foot')?.textContent?.includes('of ties'));
    } finally {
      await other.close();
      two.remove();
    }
  });

  test('a link restores arrangement, colouring, generation, selection and tab', async () => {
    await open('');
    await page.evaluate(() =>
      window.rungsight.change({
        arrangement: 'map',
        colouring: 'group',
        generation: 4,
        household: 77,
        tab: 'contrasts',
        replicate: 1,
        ties: true,
      }),
    );
    const before = await view();
    const link = page.url();
    await page.goto('about:blank');
    await page.goto(link);
    await shown();
    expect(await view()).toEqual(before);
  });

  test('survives the loss of its drawing context', async () => {
    await open('#generation=3');
    const field = page.locator('.stage');
    const before = await field.screenshot();
    await page.evaluate(async () => {
      const canvas = document.querySelector('canvas.marks') as HTMLCanvasElement;
      const lose = canvas.getContext('webgl2')?.getExtension('WEBGL_lose_context');
      await new Promise<void>((done) => {
        canvas.addEventListener('webglcontextlost', () => setTimeout(() => lose?.restoreContext(), 50), { once: true });
        canvas.addEventListener('webglcontextrestored', () => setTimeout(done, 400), { once: true });
        lose?.loseContext();
      });
    });
    const after = await field.screenshot();
    expect(after.equals(before)).toBe(true);
    complaints = complaints.filter((c) => !c.includes('CONTEXT_LOST'));
  });
});

describe('saving', () => {
  async function saved(name: string): Promise<{ name: string; bytes: Uint8Array }> {
    await page.locator('.actions .main').click();
    const [download] = await Promise.all([
      page.waitForEvent('download'),
      page.locator('.offer', { hasText: name }).click(),
    ]);
    const folder = mkdtempSync(join(tmpdir(), 'rungsight-saved-'));
    const path = join(folder, 'file');
    await download.saveAs(path);
    const bytes = new Uint8Array(readFileSync(path));
    rmSync(folder, { recursive: true });
    await page.waitForFunction(() => document.querySelector('dialog') === null);
    return { name: download.suggestedFilename(), bytes };
  }

  test('panel, study and folder are those of the results; the picture carries its caption', async () => {
    await open('#generation=3&household=20');
    expect((await saved('Panel (Parquet)')).bytes).toEqual(new Uint8Array(made.files.get('panel.parquet') ?? []));
    expect((await saved('Study (YAML)')).bytes).toEqual(new Uint8Array(made.files.get('study.yaml') ?? []));
    const csv = new TextDecoder()
      .decode((await saved('Panel (CSV)')).bytes)
      .trimEnd()
      .split(/\r?\n/);
    // arms × replicates × generations × households, and the header
    expect(csv.length).toBe(2 * 3 * 6 * 600 + 1);
    const zip = unzipSync((await saved('Results folder')).bytes);
    expect(
      Object.keys(zip)
        .map((name) => name.split('/').slice(1).join('/'))
        .sort(),
    ).toEqual([...made.files.keys()].sort());
    const picture = await saved('Picture');
    expect(picture.name).toBe('twenty-hamlets-generation-3.png');
    expect([...picture.bytes.subarray(0, 4)]).toEqual([0x89, 0x50, 0x4e, 0x47]);
    const wide = new DataView(picture.bytes.buffer).getUint32(16);
    expect(wide).toBeGreaterThan(2 * 1280 - 40);
  });

  test('a figure is saved as an SVG that stands alone, with the caution in its caption', async () => {
    await open('#generation=3&household=20');
    await page.locator('figure.shown').nth(2).waitFor();
    const [download] = await Promise.all([page.waitForEvent('download'), page.locator('.save-figure').first().click()]);
    const svg = readFileSync(await download.path(), 'utf8');
    expect(svg).toMatch(/^<\?xml/);
    expect(svg).toContain('<style>');
    expect(svg).toContain('predicts no family');
    expect(svg).toContain('<title>Line of descent');
    // well-formed XML, as any drawing program asks
    const parser = new SaxesParser();
    parser.on('error', (error) => {
      throw error;
    });
    parser.write(svg).close();
  });
});

describe('keyboard', () => {
  test('reaches everything, in the order of the screen', async () => {
    await open('#generation=3&household=20');
    await page.locator('figure.shown').nth(2).waitFor();
    const all = await page.evaluate(() => {
      const list = [...document.querySelectorAll<HTMLElement>('button, select, input, [tabindex="0"], a[href]')];
      return list.filter((e) => e.tabIndex >= 0 && e.getClientRects().length > 0 && !e.hasAttribute('disabled')).length;
    });
    await page.locator('body').focus();
    const seen = new Set<string>();
    let radios = 0;
    for (let k = 0; k < all + 5; k++) {
      await page.keyboard.press('Tab');
      const at = await page.evaluate(() => {
        const e = document.activeElement as HTMLElement;
        const list = [...document.querySelectorAll('*')];
        const style = getComputedStyle(e);
        return {
          key: String(list.indexOf(e)),
          body: e === document.body,
          outline: style.outlineStyle,
          width: style.outlineWidth,
        };
      });
      if (at.body) break;
      radios++;
      seen.add(at.key);
      expect(at.outline, 'focus is visible').not.toBe('none');
    }
    expect(radios).toBeGreaterThan(10);
    expect(seen.size).toBe(all);
  });

  test('steps generations, tabs, households and the camera', async () => {
    await open('#generation=2');
    await page.locator('.strip-bars').focus();
    await page.keyboard.press('ArrowRight');
    await page.waitForFunction(() => window.rungsight.view.generation === 3);
    await page.keyboard.press('Home');
    await page.waitForFunction(() => window.rungsight.view.generation === 0);
    await page.locator('#tab-household').focus();
    await page.keyboard.press('ArrowRight');
    await page.waitForFunction(() => window.rungsight.view.tab === 'pockets');
    await shown();
    await page.locator('.stage').focus();
    await page.keyboard.press('+');
    await page.waitForFunction(() => (window.rungsight.stage?.camera.zoom ?? 1) > 1.4);
    await page.keyboard.press('0');
    await page.waitForFunction(() => window.rungsight.stage?.camera.zoom === 1);
    await page.keyboard.press('.');
    await page.waitForFunction(() => window.rungsight.view.household === 0);
    await page.keyboard.press('Escape');
    await page.waitForFunction(() => window.rungsight.view.household === null);
    await page.keyboard.press(' ');
    expect(await page.evaluate(() => window.rungsight.playing)).toBe(true);
    await page.keyboard.press(' ');
    expect(await page.evaluate(() => window.rungsight.playing)).toBe(false);
  });
});

describe('accessibility', () => {
  const axe = readFileSync(createRequire(import.meta.url).resolve('axe-core/axe.min.js'), 'utf8');

  async function serious(): Promise<string[]> {
    // the page's own policy refuses foreign scripts, so axe comes in as an evaluation of the test
    await page.evaluate(axe);
    return page.evaluate(async () => {
      const found = await (
        window as unknown as {
          axe: { run(o: object): Promise<{ violations: { impact: string; id: string; nodes: { html: string }[] }[] }> };
        }
      ).axe.run({ runOnly: ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa'] });
      return found.violations
        .filter((v) => v.impact === 'serious' || v.impact === 'critical')
        .flatMap((v) => v.nodes.map((node) => `${v.id}: ${node.html.slice(0, 160)}`));
    });
  }

  test.each(['light', 'dark'] as const)('axe has no serious finding in any panel, %s', async (colorScheme) => {
    await open('#generation=3&household=20', { colorScheme });
    for (const tab of ['household', 'pockets', 'distribution', 'contrasts', 'estimates'] as const) {
      await page.evaluate((t) => window.rungsight.change({ tab: t }), tab);
      await page.waitForTimeout(300);
      expect(await serious(), tab).toEqual([]);
    }
    await page.locator('.actions .main').click();
    expect(await serious(), 'save').toEqual([]);
  });
});

describe('every size of screen', () => {
  test.each([
    [1280, 800],
    [1024, 768],
    [3840, 2160],
  ])('%i × %i: no text is cut, and none lies over another', async (width, height) => {
    await open('#generation=3&household=20', { viewport: { width, height } });
    for (const tab of ['household', 'distribution', 'contrasts', 'pockets'] as const) {
      await page.evaluate((t) => window.rungsight.change({ tab: t }), tab);
      await page.waitForTimeout(600);
      await shown();
      const found = await page.evaluate(crowded);
      expect(found, tab).toEqual([]);
    }
  });
});

/**
 * Texts that leave their frame or overlap each other; runs in the page.
 *
 * Looks at boxes of text: leaves of the page, and texts of its figures. Marks of the fields may lie under a text.
 */
function crowded(): string[] {
  const out: string[] = [];
  const boxes: { text: string; left: number; right: number; top: number; bottom: number; host: Element }[] = [];
  const walk = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
  while (walk.nextNode()) {
    const node = walk.currentNode as Text;
    const text = (node.textContent ?? '').trim();
    const host = node.parentElement;
    if (
      text === '' ||
      host === null ||
      host.closest('.hidden-text, option, desc, title, noscript, script, style') !== null
    )
      continue;
    const range = document.createRange();
    range.selectNodeContents(node);
    const r = range.getBoundingClientRect();
    if (r.width === 0 || r.height === 0) continue;
    // a list may scroll: what lies outside its frame is not on the screen
    const scroller = host.closest('.scrolls');
    if (scroller !== null) {
      const s = scroller.getBoundingClientRect();
      if (r.top < s.top - 1 || r.bottom > s.bottom + 1) continue;
    }
    // letters do not fill their line: compare what is inked, about the middle two thirds
    const slack = r.height * 0.2;
    boxes.push({ text, left: r.left + 1, right: r.right - 1, top: r.top + slack, bottom: r.bottom - slack, host });
  }
  for (const b of boxes) {
    if (b.left < -1 || b.right > innerWidth + 1 || b.top < -1 || b.bottom > innerHeight + 1)
      out.push(`off screen: ${b.text}`);
    const frame = b.host.closest('.panel, .field, .strip, .header, .tools, .wealth');
    if (frame !== null) {
      const f = frame.getBoundingClientRect();
      if (b.bottom > f.bottom + 1 || b.right > f.right + 1) out.push(`cut by ${frame.className}: ${b.text}`);
    }
    for (let e: Element | null = b.host; e !== null && e !== document.body; e = e.parentElement) {
      if (getComputedStyle(e).textOverflow === 'ellipsis' && e.scrollWidth > e.clientWidth + 1)
        out.push(`shortened: ${b.text}`);
    }
  }
  for (let i = 0; i < boxes.length; i++) {
    for (let j = i + 1; j < boxes.length; j++) {
      const [a, b] = [boxes[i], boxes[j]];
      const wide = Math.min(a.right, b.right) - Math.max(a.left, b.left);
      const high = Math.min(a.bottom, b.bottom) - Math.max(a.top, b.top);
      if (wide > 1.5 && high > 1.5) out.push(`“${a.text}” over “${b.text}”`);
    }
  }
  return [...new Set(out)];
}
