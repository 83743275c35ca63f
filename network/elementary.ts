/**
 * exp, log and pow in plain IEEE arithmetic, so that a study gives the same bytes in every JavaScript engine.
 *
 * `Math.exp`, `Math.log` and `Math.pow` may differ in the last digit between engines; these use only + − × ÷ and
 * bit patterns. Algorithms and coefficients are those of the freely distributable mathematical library
 * fdlibm (Sun Microsystems 1993): error below 1 unit in the last place for exp and log; `pow` is exp(y·log x),
 * with relative error about (1 + |y·ln x|) units. It lies below the graph code because both layers draw with it.
 */

const double = new Float64Array(1);
// low word first: every platform that runs a JavaScript engine today is little-endian
const words = new Int32Array(double.buffer);

const LN2_HIGH = 6.9314718036912381649e-1;
const LN2_LOW = 1.90821492927058770002e-10;
const INV_LN2 = 1.442695040888963387;

/**
 * Natural logarithm.
 *
 * @param x - any number; 0 gives −Infinity, negative or NaN gives NaN
 */
export function log(x: number): number {
  if (!(x > 0)) return x === 0 ? -Infinity : NaN;
  if (x === Infinity) return Infinity;
  let k = 0;
  if (x < 2.2250738585072014e-308) {
    k = -54;
    x *= 18014398509481984;
  }
  double[0] = x;
  const high = words[1];
  k += (high >> 20) - 1023;
  const mantissa = high & 0xfffff;
  // shift the mantissa into [√½, √2)
  const shift = (mantissa + 0x95f64) & 0x100000;
  words[1] = mantissa | (shift ^ 0x3ff00000);
  k += shift >> 20;
  const f = double[0] - 1;
  const s = f / (2 + f);
  const z = s * s;
  const r =
    z *
    (6.66666666666673513e-1 +
      z *
        (3.999999999940941908e-1 +
          z *
            (2.857142874366239149e-1 +
              z *
                (2.222219843214978396e-1 +
                  z * (1.818357216161805012e-1 + z * (1.531383769920937332e-1 + z * 1.479819860511658591e-1))))));
  const half = 0.5 * f * f;
  return k * LN2_HIGH - (half - (s * (half + r) + k * LN2_LOW) - f);
}

/** e to the x. Underflows to 0 below −745.13, overflows to Infinity above 709.78. */
export function exp(x: number): number {
  if (x > 709.782712893384) return Infinity;
  if (x < -745.1332191019411) return 0;
  if (Number.isNaN(x)) return x;
  const k = Math.floor(x * INV_LN2 + 0.5);
  const high = x - k * LN2_HIGH;
  const low = k * LN2_LOW;
  const r = high - low;
  const t = r * r;
  const c =
    r -
    t *
      (1.66666666666666019037e-1 +
        t *
          (-2.77777777770155933842e-3 +
            t * (6.61375632143793436117e-5 + t * (-1.6533902205465251539e-6 + t * 4.13813679705723846039e-8))));
  const y = 1 - (low - (r * c) / (2 - c) - high);
  if (k > -1022 && k < 1024) {
    double[0] = y;
    words[1] += k << 20;
    return double[0];
  }
  // the ends of the range, where the scaled exponent would not fit: two steps
  words[0] = 0;
  if (k > 0) {
    words[1] = (1023 + k - 1) << 20;
    return y * double[0] * 2;
  }
  words[1] = (1023 + k + 60) << 20;
  return y * double[0] * 8.673617379884035e-19;
}

/** x to the y for x ≥ 0 (NaN for x < 0). Exact for y = 0, 1 and x = 0, 1. */
export function pow(x: number, y: number): number {
  if (y === 0) return 1;
  if (y === 1) return x;
  if (x === 0) return y > 0 ? 0 : Infinity;
  return exp(y * log(x));
}
