import { describe, expect, test } from 'vitest';
import { PartialMoment } from '../../../sim/model/partial-moment.js';

/** Φ by the platform's arithmetic: Simpson on the density, to about 1e−14. */
function phi(x: number): number {
  const end = Math.min(Math.max(x, -12), 12);
  const cells = 4000;
  const h = (end + 12) / cells;
  let sum = 0;
  for (let j = 0; j <= cells; j++) {
    const t = -12 + j * h;
    sum += (j === 0 || j === cells ? 1 : j % 2 === 1 ? 4 : 2) * Math.exp(-0.5 * t * t);
  }
  return (sum * h) / 3 / Math.sqrt(2 * Math.PI);
}

/**
 * E[ε^tilt (ε − x)_+^power] by Simpson's rule after ε = x + t^p, p chosen so that the integrand vanishes smoothly at 0.
 * The engine integrates in ln ε by double-exponential quadrature.
 */
function moment(x: number, s: number, power: number, tilt: number): number {
  const p = Math.ceil(6 / (1 + power));
  const from = Math.max(Math.exp(-10 * s - 0.5 * s * s) - x, 0) ** (1 / p);
  const end = Math.max(Math.exp(10 * s + 1.5 * s * s) - x, 0) ** (1 / p);
  const cells = 40_000;
  const h = (end - from) / cells;
  let sum = 0;
  for (let j = 0; j <= cells; j++) {
    const t = from + j * h;
    const eps = x + t ** p;
    const z = (Math.log(eps) + 0.5 * s * s) / s;
    const density = Math.exp(-0.5 * z * z) / (Math.sqrt(2 * Math.PI) * s * eps);
    const weight = j === 0 || j === cells ? 1 : j % 2 === 1 ? 4 : 2;
    sum += weight * p * t ** (p * (1 + power) - 1) * density * eps ** tilt;
  }
  return (sum * h) / 3;
}

describe.each([
  [0.05, 0.6],
  [0.2, 0.3],
  [0.2, 0.9],
  [0.6, 0.6],
  [1.2, 0.5],
])('s = %d, η = %d', (s, eta) => {
  const table = new PartialMoment(s, eta);

  test('the table agrees with another quadrature', () => {
    const largest = moment(1, s, -eta, 1) + moment(0, s, -eta, 1);
    for (let v = -12; v <= 7; v += 0.413) {
      const x = Math.exp(v * s);
      // demanded 1e−10; Simpson here is good to about 1e−12
      expect(Math.abs(table.valueAt(x) - moment(x, s, 1 - eta, 0))).toBeLessThan(1e-11);
      expect(Math.abs(table.slopeAt(x) - moment(x, s, -eta, 1))).toBeLessThan(1e-11 * largest);
    }
  });

  test('at zero it is the moment in closed form, far out nothing', () => {
    const closed = Math.exp(-0.5 * eta * (1 - eta) * s * s);
    // E ε^(1−η) = exp(−η(1−η)s²/2); 1e−12 is what the table states
    expect(Math.abs(table.valueAt(0) / closed - 1)).toBeLessThan(1e-12);
    expect(Math.abs(table.slopeAt(0) / closed - 1)).toBeLessThan(1e-12);
    expect(table.valueAt(1e9)).toBe(0);
    expect(table.slopeAt(1e9)).toBe(0);
  });
});

test('as η goes to 0 it becomes the value of a call, in closed form', () => {
  const s = 0.4;
  const table = new PartialMoment(s, 1e-9);
  for (const x of [0.3, 0.8, 1, 1.3, 2]) {
    const d = (-Math.log(x) + 0.5 * s * s) / s;
    // η = 1e−9 moves the value by about as much
    expect(Math.abs(table.valueAt(x) - (phi(d) - x * phi(d - s)))).toBeLessThan(1e-8);
    expect(Math.abs(table.slopeAt(x) - phi(d))).toBeLessThan(1e-8);
  }
});
