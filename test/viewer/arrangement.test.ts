/**
 * Where marks stand, what the camera sees of them, and how a pocket is joined: arithmetic without a canvas.
 */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { fromPairs } from '../../network/graph.js';
import { type Area, axes, heightOf, onLadder, onMap, rungs } from '../../viewer/field/arrangement.js';
import { between, frame, pan, REST, zoomAt } from '../../viewer/field/camera.js';
import { sleeve } from '../../viewer/field/sleeve.js';

const area: Area = { width: 500, height: 400, top: 30, bottom: 20, side: 10 };

describe('the axis', () => {
  test('is one for all generations while growth leaves them legible', () => {
    const found = axes([Float64Array.of(10, 100, 12, 110, 11, 120)]);
    expect(new Set(found.map((a) => `${a.low}/${a.high}`)).size).toBe(1);
    expect(found[0].low).toBeLessThan(Math.log(10));
    expect(found[0].high).toBeGreaterThan(Math.log(120));
  });

  test('follows households up under strong growth, covering each generation', () => {
    const extents = new Float64Array(20);
    for (let t = 0; t < 10; t++) {
      extents[2 * t] = 10 * 3 ** t;
      extents[2 * t + 1] = 100 * 3 ** t;
    }
    const found = axes([extents]);
    found.forEach((a, t) => {
      expect(a.low).toBeLessThan(Math.log(extents[2 * t]));
      expect(a.high).toBeGreaterThan(Math.log(extents[2 * t + 1]));
      // spreads stay comparable: the same width everywhere
      expect(a.high - a.low).toBeCloseTo(found[0].high - found[0].low, 9);
    });
  });

  test('stands without knowing any extent, and with equal wealth', () => {
    for (const extents of [Float64Array.of(NaN, NaN), Float64Array.of(7, 7)]) {
      const [a] = axes([extents]);
      expect(a.high).toBeGreaterThan(a.low);
    }
  });

  test('has round rungs inside it, ascending, at most as many as asked', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -20, max: 20, noNaN: true }),
        fc.double({ min: 0.2, max: 30, noNaN: true }),
        fc.integer({ min: 3, max: 12 }),
        (low, span, most) => {
          const axis = { low, high: low + span };
          const list = rungs(axis, most);
          expect(list.length).toBeLessThanOrEqual(Math.max(most, 1) + 1);
          list.forEach((w, k) => {
            expect(Math.log(w)).toBeGreaterThanOrEqual(axis.low - 1e-9);
            expect(Math.log(w)).toBeLessThanOrEqual(axis.high + 1e-9);
            if (k > 0) expect(w).toBeGreaterThan(list[k - 1]);
            expect(String(Number(w.toPrecision(1)))).toBe(String(w));
          });
        },
      ),
    );
  });
});

describe('placements', () => {
  test('richer stands higher on the ladder, within the frame', () => {
    const axis = { low: Math.log(5), high: Math.log(200) };
    const wealth = Float64Array.of(6, 20, 150);
    const at = onLadder(Float32Array.of(0, 0.5, 1), wealth, axis, area);
    expect(at[1]).toBeGreaterThan(at[3]);
    expect(at[3]).toBeGreaterThan(at[5]);
    for (let i = 0; i < 3; i++) {
      expect(at[2 * i]).toBeGreaterThanOrEqual(area.side);
      expect(at[2 * i]).toBeLessThanOrEqual(area.width - area.side);
    }
    expect(heightOf(0, axis, area)).toBe(area.height - area.bottom);
  });

  test('a map keeps its proportions and stays in its frame, stragglers too', () => {
    const n = 400;
    const layout = new Float32Array(2 * n);
    for (let i = 0; i < n; i++) {
      layout[2 * i] = Math.cos(i) * (i % 20);
      layout[2 * i + 1] = Math.sin(i) * (i % 20);
    }
    layout[0] = 5000;
    const at = onMap(layout, area);
    for (let i = 0; i < n; i++) {
      expect(at[2 * i]).toBeGreaterThan(0);
      expect(at[2 * i]).toBeLessThan(area.width);
      expect(at[2 * i + 1]).toBeGreaterThan(0);
      expect(at[2 * i + 1]).toBeLessThan(area.height);
    }
    // two pairs equally far apart in the layout, one across and one up, are equally far apart on the screen
    const scale = (a: number, b: number, axis: 0 | 1): number =>
      Math.abs(at[2 * a + axis] - at[2 * b + axis]) / Math.abs(layout[2 * a + axis] - layout[2 * b + axis]);
    // single precision of positions: four digits
    expect(scale(41, 63, 0)).toBeCloseTo(scale(41, 63, 1), 3);
  });
});

describe('the camera', () => {
  const size = [500, 400] as const;
  const point = fc.tuple(fc.double({ min: 0, max: 500, noNaN: true }), fc.double({ min: 0, max: 400, noNaN: true }));

  test('zooming about a point and back returns; never shows beyond the field', () => {
    fc.assert(
      fc.property(point, fc.double({ min: 1, max: 20, noNaN: true }), ([x, y], factor) => {
        const near = zoomAt(REST, factor, x, y, ...size);
        const back = zoomAt(near, 1 / factor, x, y, ...size);
        expect(back.zoom).toBeCloseTo(1, 9);
        expect(back.x).toBeCloseTo(0, 6);
        for (const c of [near, pan(near, 900, -900, ...size)]) {
          expect(c.x).toBeLessThanOrEqual(1e-9);
          expect(c.x + c.zoom * 500).toBeGreaterThanOrEqual(500 - 1e-6);
          expect(c.y + c.zoom * 400).toBeGreaterThanOrEqual(400 - 1e-6);
        }
      }),
    );
  });

  test('frames a box inside the field, and moves from one view to another through views between', () => {
    const c = frame([100, 100, 140, 130], ...size);
    expect(c.zoom).toBeGreaterThan(4);
    for (const [x, y] of [
      [100, 100],
      [140, 130],
    ]) {
      expect(x * c.zoom + c.x).toBeGreaterThan(0);
      expect(x * c.zoom + c.x).toBeLessThan(500);
      expect(y * c.zoom + c.y).toBeGreaterThan(0);
      expect(y * c.zoom + c.y).toBeLessThan(400);
    }
    expect(between(REST, c, 0)).toEqual(REST);
    expect(between(REST, c, 1).zoom).toBeCloseTo(c.zoom, 9);
    expect(between(REST, c, 1).x).toBeCloseTo(c.x, 9);
  });
});

describe('a pocket', () => {
  test('is joined along its own ties by the shortest of them, and a lone member is a dot', () => {
    // a triangle 0-1-2 with one long side, and 3 without ties inside
    const ties = fromPairs(5, Uint32Array.of(0, 1, 0, 3), Uint32Array.of(1, 2, 2, 4), null);
    const at = Float32Array.of(0, 0, 10, 0, 10, 10, 90, 90, 95, 95);
    const found = sleeve([0, 1, 2, 3], ties, at, 50);
    expect(found.body.match(/L/g)?.length).toBe(2);
    expect(found.body).not.toContain('M0.0 0.0L10.0 10.0');
    expect(found.body).toContain('M90.0 90.0h');
    // not one tie leads outside
    expect(found.body).not.toContain('95');
    expect(found.links).toBe('');
  });

  test('has thin links where its parts lie far apart', () => {
    const ties = fromPairs(4, Uint32Array.of(0, 1, 2), Uint32Array.of(1, 2, 3), null);
    const found = sleeve([0, 1, 2, 3], ties, Float32Array.of(0, 0, 5, 0, 205, 0, 210, 0), 50);
    expect(found.body.match(/L/g)?.length).toBe(2);
    expect(found.links.match(/L/g)?.length).toBe(1);
  });
});
