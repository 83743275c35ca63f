/**
 * Figures are well-formed, say what they show, carry no style of their own, and stand alone when saved.
 */
import fc from 'fast-check';
import { SaxesParser } from 'saxes';
import { describe, expect, test } from 'vitest';
import { decisionFigure } from '../../../sim/results/figures/decision.js';
import { densitiesFigure, roundWealths } from '../../../sim/results/figures/densities.js';
import { descentFigure } from '../../../sim/results/figures/descent.js';
import { fieldFigure } from '../../../sim/results/figures/field.js';
import { figureStyle, short, spread, standalone, wrapped } from '../../../sim/results/figures/figure.js';
import { intervalsFigure, intervalsHeight } from '../../../sim/results/figures/intervals.js';
import { lifelinesFigure } from '../../../sim/results/figures/lifelines.js';
import { linesFigure } from '../../../sim/results/figures/lines.js';
import { referenceFigure } from '../../../sim/results/figures/reference.js';
import { transitionsFigure } from '../../../sim/results/figures/transitions.js';

const SIZE = { width: 360, height: 160 };
const ODD = 'Salt & <marsh> "farms"';

/** One of every figure, with an awkward name and missing values where there may be any. */
const FIGURES: Readonly<Record<string, string>> = {
  lines: linesFigure(
    SIZE,
    [
      { name: ODD, x: [0, 1, 2, 3], y: [0.1, NaN, 0.3, 0.2], low: [0, NaN, 0.2, 0.1], high: [0.2, NaN, 0.4, 0.3] },
      { name: 'mixed', x: [0, 1, 2, 3], y: [0.2, 0.2, 0.2, 0.2] },
    ],
    {
      title: ODD,
      described: 'd',
      xSays: 'generation',
      ySays: 'share',
      xNames: String,
      yNames: String,
      against: 0.1,
      now: 2,
    },
  ),
  'lines without values': linesFigure(SIZE, [{ name: 'none', x: [0, 1], y: [NaN, NaN] }], {
    title: 'Empty',
    described: 'd',
    xSays: 'x',
    ySays: 'y',
    xNames: String,
    yNames: String,
  }),
  descent: descentFigure(SIZE, { wealth: [1, 20, 3, 400], aspiration: [2, 25, 4], met: [0, 1, 0], now: 1 }),
  'descent of equals': descentFigure(SIZE, { wealth: [5, 5], aspiration: [5], met: [1], now: 0 }),
  decision: decisionFigure(SIZE, {
    planned: Array.from({ length: 50 }, (_, k) => k + 1),
    utility: Array.from({ length: 50 }, (_, k) => (k === 49 ? -Infinity : 10 - ((k - 20) / 10) ** 2)),
    peaks: [
      { planned: 21, utility: 10, met: 0 },
      { planned: 45, utility: 4, met: 1 },
    ],
    chosen: 0,
    aspirations: [44],
  }),
  reference: referenceFigure(SIZE, {
    own: 10,
    neighbours: [5, 20, 40],
    aspirations: [30, 32],
    frustrated: true,
    society: 18,
  }),
  'reference of nobody': referenceFigure(SIZE, {
    own: 10,
    neighbours: [],
    aspirations: [10],
    frustrated: false,
    society: NaN,
  }),
  transitions: transitionsFigure(
    SIZE,
    [
      { name: ODD, share: Array.from({ length: 25 }, (_, k) => (k % 6 === 0 ? 0.6 : 0.1)) },
      { name: 'mixed', share: new Array(25).fill(0.2) },
    ],
    'Transitions',
  ),
  lifelines: lifelinesFigure(
    SIZE,
    [
      { pocket: 0, generation: 1, size: 12, pValue: 0.01, parent: -1 },
      { pocket: 0, generation: 2, size: 20, pValue: 0.2, parent: 0 },
      { pocket: 3, generation: 2, size: 6, pValue: NaN, parent: 0 },
    ],
    { title: 'Life lines', generations: 4, now: 2 },
  ),
  'no life lines': lifelinesFigure(SIZE, [], { title: 'Life lines', generations: 4 }),
  intervals: intervalsFigure(
    { width: 360, height: intervalsHeight(3) },
    [
      { name: ODD, estimate: 1, low: 0.5, high: 1.5 },
      { name: 'b', estimate: -1, low: -3, high: 1 },
      { name: 'c', estimate: NaN, low: NaN, high: NaN },
    ],
    { title: 'Contrasts', described: 'd', xSays: 'difference' },
  ),
  densities: densitiesFigure(
    { width: 220, height: 260 },
    { name: 'apart', wealth: Float64Array.of(1, 4, 9, 16), met: Uint8Array.of(0, 1, 1, 0) },
    { name: ODD, wealth: Float64Array.of(2, 2, 2, 90), met: null },
    'Wealth',
  ),
  field: fieldFigure(
    { width: 220, height: 200 },
    { name: ODD, sideways: [0, 0.5, 1], wealth: [1, 10, 100], met: [0, 1, 2] },
    [-1, 6],
    'Field',
  ),
};

function parsed(svg: string): { title: string; desc: string; role: string } {
  const found = { title: '', desc: '', role: '' };
  let open = '';
  const parser = new SaxesParser();
  parser.on('error', (error) => {
    throw error;
  });
  parser.on('opentag', (tag) => {
    open = tag.name;
    if (tag.name === 'svg') found.role = String(tag.attributes.role);
    for (const [name, value] of Object.entries(tag.attributes)) {
      expect(name, 'no style of its own').not.toBe('style');
      expect(String(value), `${tag.name} ${name}`).not.toMatch(/NaN|Infinity|undefined/);
    }
  });
  parser.on('text', (text) => {
    if (open === 'title') found.title += text;
    if (open === 'desc') found.desc += text;
  });
  parser.on('closetag', () => {
    open = '';
  });
  parser.write(svg).close();
  return found;
}

describe.each(Object.entries(FIGURES))('%s', (_name, svg) => {
  test('is well-formed, has a role, a title and a description, and no number that is none', () => {
    const { title, desc, role } = parsed(svg);
    expect(role).toBe('img');
    expect(title.length).toBeGreaterThan(3);
    expect(desc.length).toBeGreaterThan(0);
    expect(desc).not.toMatch(/NaN|undefined|Infinity/);
  });

  test('uses only classes that the style sheet knows', () => {
    const style = figureStyle('light');
    for (const [, names] of svg.matchAll(/class="([^"]*)"/g)) {
      for (const name of names.split(' ')) {
        if (['figure', 'f-text', 'l-0'].includes(name)) continue;
        expect(style, name).toMatch(new RegExp(`\\.${name}[{ ,]`));
      }
    }
  });

  test.each(['light', 'dark'] as const)('stands alone, %s', (theme) => {
    const alone = standalone(
      svg,
      theme,
      'A caption long enough to be broken into more than one line of the picture it stands under.',
    );
    parsed(alone.replace(/^<\?xml.*?\?>\s*/, ''));
    expect(alone).toContain('<style>');
    expect(alone).toContain('width=');
    expect(alone).not.toContain('var(');
    expect(alone).toContain('A caption');
  });
});

test('the decision says by how much the other peak falls short, and where the choice is', () => {
  const { desc } = parsed(FIGURES.decision);
  expect(desc).toContain('plan for 21');
  expect(desc).toContain('planning for 45');
});

test('the page’s style takes its colours from the page', () => {
  const style = figureStyle('page');
  expect(style).toContain('var(--satisfied)');
  expect(style).toContain('var(--frustrated-text)');
  expect(style).not.toMatch(/#[0-9a-f]{6}/i);
});

test('labels spread without touching, in order, within their room where it suffices', () => {
  fc.assert(
    fc.property(fc.array(fc.double({ min: 0, max: 100, noNaN: true }), { minLength: 1, maxLength: 6 }), (wanted) => {
      const found = spread(wanted, 15, 0, 100);
      const order = wanted.map((_, k) => k).sort((a, b) => wanted[a] - wanted[b]);
      for (let k = 1; k < order.length; k++) {
        // 1e-9: rounding of a few additions
        expect(found[order[k]] - found[order[k - 1]]).toBeGreaterThanOrEqual(15 - 1e-9);
      }
      for (const y of found) {
        expect(y).toBeGreaterThanOrEqual(-1e-9);
        expect(y).toBeLessThanOrEqual(100 + 1e-9);
      }
    }),
  );
});

test('numbers are short and read back within a hundredth of their size', () => {
  fc.assert(
    fc.property(fc.double({ min: 1e-4, max: 1e6 - 1, noNaN: true }), (v) => {
      const read = Number(short(v).replaceAll('\u202f', ''));
      expect(Math.abs(read / v - 1)).toBeLessThan(0.06);
      expect(short(v).length).toBeLessThanOrEqual(7);
    }),
  );
  expect(short(0)).toBe('0');
  expect(short(NaN)).toBe('–');
});

test('round wealths lie between the ends', () => {
  expect(roundWealths(Math.log(8), Math.log(120))).toEqual([10, 20, 50, 100]);
  expect(roundWealths(Math.log(8), Math.log(2e5), 5)).toEqual([10, 100, 1000, 10000, 100000]);
  expect(roundWealths(Math.log(0.002), Math.log(2000), 3)).toEqual([0.01, 1, 100]);
});

test('a caption is broken between words', () => {
  expect(wrapped('one two three four', 9)).toEqual(['one two', 'three', 'four']);
});
