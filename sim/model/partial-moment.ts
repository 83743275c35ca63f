/**
 * B(x) = E[(ε − x)_+^(1−η)] for a lognormal ε of mean 1, and H(x) = E[ε·(ε − x)_+^(−η)], tabulated once.
 *
 * B values a threshold milestone under expected risk, H its slope. The integrals run over the truncated density by
 * double-exponential quadrature with the singular end substituted away; a fixed Gauss–Hermite rule would put a kink at
 * every node. The table is Chebyshev on panels that halve until its own remainder is below 1e−13 of the largest value
 * (1e−10 is demanded).
 */
import { exp, log } from '../../network/elementary.js';
import { chebyshevAt, chebyshevFit, chebyshevNode, TERMS } from './chebyshev.js';

/** Beyond this many standard deviations of log the density holds less than 1e−21. */
const TAIL = 9.5;

/** Both functions of x ≥ 0 for one (s, η). */
export class PartialMoment {
  private readonly edges: Float64Array;
  private readonly b: Float64Array;
  private readonly h: Float64Array;
  /** Both are 0 from here on. */
  private readonly end: number;

  constructor(sdLog: number, eta: number) {
    const mean = -0.5 * sdLog * sdLog;
    this.end = exp(mean + TAIL * sdLog + sdLog * sdLog);
    const edges: number[] = [0];
    const b: number[] = [];
    const h: number[] = [];
    const valueB = new Float64Array(TERMS);
    const valueH = new Float64Array(TERMS);
    const largestB = integral(0, sdLog, 1 - eta, 0);
    let largestH = integral(0, sdLog, -eta, 1);
    const refine = (from: number, to: number, depth: number): void => {
      for (let j = 0; j < TERMS; j++) {
        const x = from + (to - from) * 0.5 * (1 + chebyshevNode(j));
        valueB[j] = integral(x, sdLog, 1 - eta, 0);
        valueH[j] = integral(x, sdLog, -eta, 1);
        largestH = Math.max(largestH, valueH[j]);
      }
      const cb = new Float64Array(TERMS);
      const ch = new Float64Array(TERMS);
      chebyshevFit(valueB, cb, 0);
      chebyshevFit(valueH, ch, 0);
      const remainder = (c: Float64Array): number => Math.abs(c[TERMS - 1]) + Math.abs(c[TERMS - 2]);
      if (depth < 40 && (remainder(cb) > 1e-13 * largestB || remainder(ch) > 1e-13 * largestH)) {
        const middle = 0.5 * (from + to);
        refine(from, middle, depth + 1);
        refine(middle, to, depth + 1);
        return;
      }
      edges.push(to);
      b.push(...cb);
      h.push(...ch);
    };
    refine(0, 1, 0);
    if (this.end > 1) refine(1, this.end, 0);
    this.edges = Float64Array.from(edges);
    this.b = Float64Array.from(b);
    this.h = Float64Array.from(h);
  }

  /** B(x), absolute error below 1e−12·B(0). */
  valueAt(x: number): number {
    return this.read(this.b, x);
  }

  /** H(x), absolute error below 1e−12 of its largest value. */
  slopeAt(x: number): number {
    return this.read(this.h, x);
  }

  private read(coefficients: Float64Array, x: number): number {
    if (x >= this.end) return 0;
    const edges = this.edges;
    let low = 0;
    let high = edges.length - 1;
    while (high - low > 1) {
      const middle = (low + high) >> 1;
      if (edges[middle] <= x) low = middle;
      else high = middle;
    }
    const u = (2 * (x - edges[low])) / (edges[low + 1] - edges[low]) - 1;
    return chebyshevAt(coefficients, low * TERMS, u);
  }
}

/**
 * ∫ e^(u·tilt) (e^u − x)^power φ(u) du over e^u > x, φ normal with mean −s²/2 and standard deviation s, power > −1.
 */
function integral(x: number, s: number, power: number, tilt: number): number {
  const mean = -0.5 * s * s;
  const from = mean - TAIL * s;
  // the tilt and the power move the bulk of the integrand up by up to (1 + tilt)·s² in log
  const to = mean + TAIL * s + 2 * s * s;
  const cut = x > 0 ? log(x) : -Infinity;
  if (cut >= to) return 0;
  const singular = cut > from;
  const start = singular ? cut : from;
  const width = to - start;
  // u = start + width·t^p: with p = 1/(1 + power) the singular power becomes a constant
  const p = singular && power < 0 ? 1 / (1 + power) : 1;
  let sum = 0;
  const step = 0.03125;
  for (let j = -128; j <= 128; j++) {
    const w = j * step;
    // tanh-sinh on (0, 1): t = 1/(1 + e^(−π sinh w))
    const ew = exp(w);
    const sinh = 0.5 * (ew - 1 / ew);
    const cosh = 0.5 * (ew + 1 / ew);
    const e = exp(-Math.PI * sinh);
    const t = 1 / (1 + e);
    // 1 − t and its log, kept accurate at the far end by symmetry
    const weight = Math.PI * cosh * t * (e * t);
    if (!(weight > 0) || !(t > 0)) continue;
    const logT = e > 1e300 ? -Math.PI * -sinh : log(t);
    const r = p === 1 ? t * width : exp(p * logT) * width;
    const u = start + r;
    const density = (u - mean) / s;
    // (e^u − x)^power = x^power·(e^r − 1)^power
    const logBody = singular ? cut + logExpMinusOne(r) : log(exp(u) - Math.max(x, 0));
    if (logBody === -Infinity) continue;
    const jacobian = p === 1 ? width : width * p * exp((p - 1) * logT);
    sum += weight * jacobian * exp(power * logBody + tilt * u - 0.5 * density * density);
  }
  return (sum * step * 0.3989422804014327) / s;
}

/** ln(e^r − 1) for r ≥ 0. */
function logExpMinusOne(r: number): number {
  if (r < 1e-5) return log(r) + 0.5 * r + (r * r) / 24;
  if (r < 0.1) {
    // series of (e^r − 1)/r
    const tail = r * (0.5 + r * (1 / 6 + r * (1 / 24 + r * (1 / 120 + r * (1 / 720 + r * (1 / 5040 + r / 40320))))));
    return log(r) + log(1 + tail);
  }
  return log(exp(r) - 1);
}
