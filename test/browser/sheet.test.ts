/**
 * The study sheet in a real browser, alone on a page under the strict content security policy.
 */
import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import type { Browser, Locator, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest';
import { parse } from 'yaml';
import { SAMPLE } from '../viewer/sheet/sample.js';
import { type BuiltPage, builtPage } from './built-page.js';
import { launch } from './chromium.js';
import type { SheetPage } from './pages/sheet.js';

let site: BuiltPage;
let browser: Browser;
let page: Page;
let complaints: string[];

beforeAll(async () => {
  [site, browser] = await Promise.all([builtPage('sheet'), launch()]);
  page = await browser.newPage({ viewport: { width: 1280, height: 800 } });
  page.on('console', (message) => {
    if (['error', 'warning'].includes(message.type())) complaints.push(message.text());
  });
  page.on('pageerror', (error) => complaints.push(String(error)));
  await page.goto(site.url);
});
afterAll(async () => {
  await browser?.close();
  await site?.close();
});
beforeEach(async () => {
  complaints = [];
  await page.evaluate(() => (window as unknown as { page: SheetPage }).page.fresh());
});
afterEach(() => {
  // a refused style, a script error or a warning of a library is a failure wherever it comes up
  expect(complaints).toEqual([]);
});

/** What an element says, blanks as one. */
const words = (at: Locator): Promise<string> =>
  at.evaluate((element) => (element.textContent ?? '').replace(/\s+/g, ' ').trim());
const text = (): Promise<string> => page.evaluate(() => (window as unknown as { page: SheetPage }).page.sheet.yaml);
const told = (): Promise<SheetPage['told']> =>
  page.evaluate(() => (window as unknown as { page: SheetPage }).page.told);
const state = (): Promise<string> => words(page.locator('#sheet-state'));
const study = async (): Promise<Record<string, never>> => parse(await text()) as Record<string, never>;

describe('two sides of one study', () => {
  test('a number typed in the form stands in the text, comments untouched', async () => {
    await page.locator('#set-preferences-curvature').fill('0.75');
    expect(await text()).toBe(SAMPLE.replace('curvature: 0.6 ', 'curvature: 0.75 '));
    expect(await state()).toContain('Ready to run');
  });

  test('what is typed in the text stands in the form', async () => {
    await page.locator('.cm-content').click();
    await page.keyboard.press('Control+Home');
    for (let line = 0; line < 3; line++) await page.keyboard.press('ArrowDown');
    await page.keyboard.press('End');
    await page.keyboard.type('0');
    expect(await page.locator('#set-replicates').inputValue()).toBe('40');
  });

  test('one undo for both sides', async () => {
    await page.locator('#set-generations').fill('9');
    await page.locator('#set-technology').selectOption('concave');
    expect((await study()).technology).toMatchObject({ kind: 'concave', scale: 8 });
    await page.keyboard.press('Control+z');
    expect(await page.locator('#set-technology').inputValue()).toBe('linear');
    await page.keyboard.press('Control+z');
    expect(await text()).toBe(SAMPLE);
    await page.getByRole('button', { name: 'redo' }).click();
    expect(await page.locator('#set-generations').inputValue()).not.toBe('6');
  });

  test('closing loses nothing: the edits are there again, and undo leads back', async () => {
    await page.locator('#set-generations').fill('9');
    await page.evaluate(() => (window as unknown as { page: SheetPage }).page.reopen());
    expect(await page.locator('#set-generations').inputValue()).toBe('9');
    expect(await words(page.locator('.sheet-name'))).toContain('edited');
    await page.getByRole('button', { name: 'undo' }).click();
    expect(await text()).toBe(SAMPLE);
  });

  test('an intermediate number is left as typed', async () => {
    const control = page.locator('#set-preferences-child_weight');
    await control.fill('');
    await control.pressSequentially('0.05');
    expect(await control.inputValue()).toBe('0.05');
    expect((await study()).preferences).toMatchObject({ child_weight: 0.05 });
  });

  test('the keyboard on a setting marks its line, the cursor in the text marks its setting', async () => {
    await page.locator('#set-population-wealth-gini').focus();
    expect(await words(page.locator('.cm-line.marked'))).toContain('gini: 0.42');
    await page.locator('.cm-line', { hasText: 'gross_return' }).click();
    await expect.poll(() => page.locator('.form .at').count()).toBeGreaterThan(0);
    expect(await page.locator('.form .at').first().getAttribute('data-path')).toMatch(/^technology/);
  });
});

describe('what is wrong', () => {
  test('is said at the setting, at the line and below, and stops the run', async () => {
    await page.locator('#set-preferences-curvature').fill('-1');
    const row = page.locator('[data-path="preferences.curvature"]');
    expect(await words(row.locator('.wrong'))).toContain('give a number above 0');
    expect(await page.locator('#set-preferences-curvature').getAttribute('aria-invalid')).toBe('true');
    await expect.poll(() => page.locator('.cm-lint-marker-error').count()).toBe(1);
    expect(await state()).toContain('1 problem');
    expect(await words(page.locator('.fault-list'))).toContain('line 23');
    expect(await page.getByRole('button', { name: 'Run', exact: true }).isDisabled()).toBe(true);
  });

  test('a misspelt key is told with the right one', async () => {
    await page.evaluate(() => {
      const { sheet } = (window as unknown as { page: SheetPage }).page;
      sheet.open(sheet.yaml.replace('curvature: 0.6', 'curvatur: 0.6'));
    });
    expect(await words(page.locator('.fault-list'))).toContain("did you mean 'curvature'?");
    expect(await words(page.locator('#q-investing .wrong').first())).toContain("unknown key 'curvatur'");
  });

  test('text that is not YAML keeps the form as it was, and says so', async () => {
    await page.locator('.cm-content').click();
    await page.keyboard.press('Control+End');
    await page.keyboard.type('arms: [');
    expect(await page.locator('.unreadable').isVisible()).toBe(true);
    expect(await page.locator('#set-generations').inputValue()).toBe('6');
    expect(await page.locator('#set-generations').isDisabled()).toBe(true);
    await page.keyboard.press('Control+z');
    expect(await page.locator('.unreadable').count()).toBe(0);
    expect(await page.locator('#set-generations').isEnabled()).toBe(true);
  });
});

describe('parts', () => {
  test('groups, arms, milestones and parts of a mix are added and removed', async () => {
    await page.getByRole('button', { name: 'Add a group' }).click();
    await page.getByRole('button', { name: 'Add an arm' }).click();
    await page.getByRole('button', { name: 'Add a milestone' }).click();
    await page.getByRole('button', { name: 'Add a part' }).first().click();
    const now = (await study()) as unknown as {
      population: { groups: unknown[] };
      arms: { network: unknown }[];
      reference: { milestones: { mix: unknown[] }[] };
    };
    expect(now.population.groups).toHaveLength(3);
    expect(now.arms[2]!.network).toEqual({ from: 'segregated', mixing: { share: 0.5 } });
    expect(now.reference.milestones).toHaveLength(2);
    expect(now.reference.milestones[0]!.mix).toHaveLength(4);
    // the new group has no household yet, and says nothing wrong
    expect(await state()).toContain('Ready to run');
    await page.getByRole('button', { name: 'Remove group group 3' }).click();
    await page.getByRole('button', { name: 'Remove Arm arm 3' }).click();
    await page.getByRole('button', { name: 'Remove Milestone 2' }).click();
    await page.getByRole('button', { name: 'Remove part 4' }).click();
    expect(await text()).toBe(SAMPLE);
  });

  test('a network of another kind keeps what both have', async () => {
    await page.locator('#set-arms-0-network').selectOption('similarity');
    expect(await text()).toContain('network: {kind: similarity, mean_degree: 10, strength: 0.6}');
    await page.locator('#set-arms-0-network').selectOption('ring');
    expect(await text()).toContain('network: {kind: ring, degree: 10}');
    await page.locator('#set-arms-0-network').selectOption('from');
    expect(((await study()).arms as { network: object }[])[0]!.network).toMatchObject({ from: expect.anything() });
  });

  test('every kind of every alternative starts without a problem of its own', async () => {
    for (const [id, skip] of [
      // none of the places would leave nothing for the share between them
      ['#set-population-places', ['']],
      ['#set-technology', []],
      // a file is not there, a graph of the literature has its own number of households, an arm cannot make itself
      ['#set-arms-0-network', ['file', 'from']],
      ['#set-arms-1-network-mixing', ['']],
      ['#set-keep-panel', ['']],
    ] as const) {
      const values = await page
        .locator(`${id} option`)
        .evaluateAll((all) => all.map((one) => (one as HTMLOptionElement).value));
      for (const value of values) {
        if ((skip as readonly string[]).includes(value)) continue;
        await page.locator(id).selectOption(value);
        expect(`${id} ${value}: ${await state()}`).toContain('Ready to run');
      }
      if (id === '#set-arms-0-network') await page.locator(id).selectOption('blocks');
    }
  });

  test('regressions are written in the text: the form says how many, and where', async () => {
    expect(await words(page.locator('[data-path="estimates"]'))).toContain('none');
    await page.evaluate(() => {
      const { sheet } = (window as unknown as { page: SheetPage }).page;
      sheet.open(
        `${sheet.yaml}estimates:\n  - {name: one, outcome: growth, covariates: [wealth]}\n  - {name: one, outcome: growth}\n`,
      );
    });
    expect(await words(page.locator('[data-path="estimates"]'))).toContain(
      'one: two estimates have this name; rename one',
    );
    await page.getByRole('button', { name: '2 in the text' }).click();
    expect(await page.evaluate(() => document.activeElement?.className)).toBe('yaml-editor');
  });

  test('the spread of wealth is said either way', async () => {
    await page.getByRole('button', { name: 'give the standard deviation of log instead' }).click();
    // Gini 0.42 of a lognormal: s = √2·Φ⁻¹(0.71) = 0.783 (Aitchison and Brown 1957)
    expect(((await study()).population as { wealth: object }).wealth).toMatchObject({ sd_log: 0.783 });
    await page.getByRole('button', { name: 'give the Gini instead' }).click();
    expect(((await study()).population as { wealth: object }).wealth).toMatchObject({ gini: 0.42 });
  });

  test('an override starts from what it overrides, and goes again', async () => {
    await page.getByRole('button', { name: 'Add own technology' }).first().click();
    expect(((await study()).arms as { technology: object }[])[0]!.technology).toEqual({
      kind: 'linear',
      gross_return: 2.5,
    });
    await page.getByRole('button', { name: 'Remove own technology' }).click();
    expect(await text()).toBe(SAMPLE);
  });
});

describe('files', () => {
  const drop = async (files: { name: string; body: string }[]): Promise<void> => {
    const transfer = await page.evaluateHandle((given) => {
      const data = new DataTransfer();
      for (const { name, body } of given) data.items.add(new File([body], name));
      return data;
    }, files);
    await page.dispatchEvent('.study-sheet', 'dragover', { dataTransfer: transfer });
    await page.dispatchEvent('.study-sheet', 'drop', { dataTransfer: transfer });
  };
  const HOUSEHOLDS = 'household,wealth,place,group,x_age\na,10,north,up,30\nb,20,north,up,\nc,40,south,down,50\n';

  test('a household file says what was read, and becomes the households', async () => {
    await drop([{ name: 'people.csv', body: HOUSEHOLDS }]);
    const file = page.locator('.file', { hasText: 'people.csv' });
    await file.waitFor();
    const said = await words(file);
    expect(said).toContain('3 rows');
    expect(said).toContain('10 to 40');
    expect(said).toContain('2 (north, south)');
    expect(said).toContain('up 2, down 1');
    expect(said).toContain('1 row empty');
    await file.getByRole('button', { name: 'use as the households' }).click();
    const now = (await study()) as unknown as { population: Record<string, unknown> };
    expect(now.population.households_file).toBe('people.csv');
    expect(now.population.wealth).toBeUndefined();
  });

  test('a tie file says ties and isolates, and becomes the ties of an arm', async () => {
    await drop([
      { name: 'people.csv', body: HOUSEHOLDS },
      { name: 'ties.csv', body: 'source,target\na,b\n' },
    ]);
    await page.getByRole('button', { name: 'use as the households' }).click();
    const file = page.locator('.file', { hasText: 'ties.csv' });
    expect(await words(file)).toContain('1 tie between 3 households');
    expect(await words(file)).toContain('1 household');
    await file.getByRole('button', { name: 'use as the ties of segregated' }).click();
    expect(((await study()).arms as { network: object }[])[0]!.network).toEqual({ kind: 'file', path: 'ties.csv' });
  });

  test('a wrong file says where and what, and nothing of it is used', async () => {
    await drop([{ name: 'people.csv', body: 'household,wealth\na,10\nb,-3\nb,5\n' }]);
    const file = page.locator('.file', { hasText: 'people.csv' });
    await file.waitFor();
    const said = await words(file);
    expect(said).toContain('people.csv row 3 column wealth');
    expect(said).toContain("wealth is '-3'");
    expect(said).toContain("household 'b' stands in row 3 too");
    expect(await file.getByRole('button', { name: /use as/ }).count()).toBe(0);
    expect(await text()).toBe(SAMPLE);
  });

  test('a file the study names and that is not here is missed at its line', async () => {
    await page.locator('#origin').selectOption('file');
    await expect.poll(state).toContain('1 problem');
    expect(await words(page.locator('.fault-list'))).toContain("file 'households.csv' was not found");
    await drop([
      { name: 'households.csv', body: HOUSEHOLDS.replaceAll(',up,', ',lowland,').replaceAll(',down,', ',upland,') },
    ]);
    await expect.poll(state).toContain('Ready to run: 3 households');
  });

  test('what a run found stays said until the next edit, beside what the files say', async () => {
    await drop([
      { name: 'people.csv', body: HOUSEHOLDS.replaceAll(',up,', ',lowland,').replaceAll(',down,', ',upland,') },
    ]);
    await page.getByRole('button', { name: 'use as the households' }).click();
    await expect.poll(state).toContain('Ready to run: 3 households');
    await page.evaluate(() => {
      const { page: own } = window as unknown as { page: SheetPage };
      own.reopen();
      own.sheet.report([
        { code: 'out-of-reach', place: 'arms[1].network.mixing', problem: 'cannot be reached', remedy: 'try less' },
      ]);
    });
    // longer than the files take to be read again
    await page.waitForTimeout(700);
    expect(await state()).toContain('1 problem');
    expect(await words(page.locator('.fault-list'))).toMatch(/^line \d+ cannot be reached; try less$/);
    await page.locator('#set-generations').fill('4');
    await expect.poll(state).toContain('Ready to run: 3 households');
  });

  test('a study file dropped replaces the text; undo brings it back', async () => {
    await drop([{ name: 'other.yaml', body: SAMPLE.replace('Two valleys', 'Three rivers') }]);
    await expect.poll(() => page.locator('#set-study').inputValue()).toBe('Three rivers');
    await page.getByRole('button', { name: 'undo' }).click();
    expect(await page.locator('#set-study').inputValue()).toBe('Two valleys');
  });
});

describe('studies', () => {
  test('a built-in study can be started from, and runs as it is', async () => {
    const names = await page
      .locator('.sheet-actions option')
      .evaluateAll((all) => all.map((one) => (one as HTMLOptionElement).value).filter((value) => value !== ''));
    expect(names[0]).toBe('villages-apart');
    for (const name of names) {
      await page.locator('.sheet-actions select').selectOption(name);
      await expect.poll(async () => `${name}: ${await state()}`).toContain('Ready to run');
    }
    await page.getByRole('button', { name: 'Run', exact: true }).click();
    expect((await told()).at(-1)).toMatchObject({ event: 'run', yaml: await text() });
  });

  test('the text is saved as it stands', async () => {
    await page.getByRole('button', { name: 'Save study' }).click();
    expect(await told()).toEqual([{ event: 'save', yaml: SAMPLE }]);
  });
});

describe('for everyone', () => {
  const axe = readFileSync(createRequire(import.meta.url).resolve('axe-core/axe.min.js'), 'utf8');

  test.each(['light', 'dark'])('no finding of the accessibility checker in %s', async (theme) => {
    await page.goto(`${site.url}?theme=${theme}`);
    await page.waitForSelector('.study-sheet .question');
    await page.locator('#set-preferences-curvature').fill('-1');
    // the checker is handed to the page past its policy, as a person's own tool would be
    await page.evaluate(axe);
    const found = await page.evaluate(async () => {
      const { axe: checker } = window as unknown as {
        axe: { run(): Promise<{ violations: { id: string; nodes: { html: string; failureSummary: string }[] }[] }> };
      };
      const { violations } = await checker.run();
      return violations.map(
        ({ id, nodes }) => `${id}: ${nodes.map((node) => `${node.html} ${node.failureSummary}`).join(' | ')}`,
      );
    });
    expect(found).toEqual([]);
  });

  test('the keyboard reaches every control, and leaves the editor', async () => {
    const reached = new Set<string>();
    let stuck = 0;
    let last = '';
    for (let step = 0; step < 400 && stuck < 3; step++) {
      await page.keyboard.press('Tab');
      const at = await page.evaluate(() => {
        let element = document.activeElement;
        while (element?.shadowRoot?.activeElement) element = element.shadowRoot.activeElement;
        if (element === null || element === document.body) return 'body';
        return (
          element.id ||
          element.getAttribute('aria-label') ||
          element.textContent?.trim().slice(0, 40) ||
          element.tagName
        );
      });
      if (at === 'body' && reached.size > 5) break;
      stuck = at === last ? stuck + 1 : 0;
      last = at;
      reached.add(at);
    }
    const controls = await page
      .locator('.form input, .form select')
      .evaluateAll((all) => all.map((one) => one.id).filter((id) => id !== ''));
    expect(controls.filter((id) => !reached.has(id))).toEqual([]);
    expect(reached).toContain('The study as YAML');
    expect(reached).toContain('add a file…');
  });

  test.each([
    [1280, 800],
    [1024, 768],
    [3840, 2160],
  ])('nothing overlaps or is cut at %i × %i', async (width, height) => {
    await page.setViewportSize({ width, height });
    await page.locator('#set-preferences-curvature').fill('-1');
    await page.getByRole('button', { name: 'Add a group' }).click();
    const wrong = await page.evaluate(() => {
      const out: string[] = [];
      const say = (element: Element): string =>
        `${element.tagName}.${element.className} “${(element.textContent ?? '').trim().slice(0, 30)}”`;
      if (document.documentElement.scrollWidth > innerWidth) out.push('the page scrolls sideways');
      const boxes = [
        ...document.querySelectorAll(
          '.setting > *, .entries tbody td, .sheet-actions > *, .sheet-title, legend, legend + .act',
        ),
      ]
        .filter((element) => element.checkVisibility())
        .map((element) => {
          // what the questions' own scrolling hides is not on the screen
          const { left, right, top, bottom } = element.getBoundingClientRect();
          const within = element.closest('.form')?.getBoundingClientRect();
          const from = Math.max(top, within?.top ?? top);
          const to = Math.min(bottom, within?.bottom ?? bottom);
          return { element, box: { left, right, top: from, bottom: to } };
        })
        .filter(({ box }) => box.right > box.left && box.bottom > box.top);
      for (let i = 0; i < boxes.length; i++) {
        for (let j = i + 1; j < boxes.length; j++) {
          const a = boxes[i]!;
          const b = boxes[j]!;
          if (a.element.contains(b.element) || b.element.contains(a.element)) continue;
          const x = Math.min(a.box.right, b.box.right) - Math.max(a.box.left, b.box.left);
          const y = Math.min(a.box.bottom, b.box.bottom) - Math.max(a.box.top, b.box.top);
          // half a pixel is rounding
          if (x > 0.5 && y > 0.5) out.push(`${say(a.element)} overlaps ${say(b.element)}`);
        }
      }
      for (const element of document.querySelectorAll(
        '.setting label, .setting .label, .says, .wrong p, .button, .plain, h2, h3, th',
      )) {
        if (!element.checkVisibility()) continue;
        if (element.scrollWidth > element.clientWidth + 1 && getComputedStyle(element).display !== 'inline') {
          out.push(`${say(element)} is cut`);
        }
      }
      const form = document.querySelector('.form')!;
      if (form.scrollWidth > form.clientWidth + 1) out.push('the questions scroll sideways');
      return out;
    });
    expect(wrong).toEqual([]);
  });
});
