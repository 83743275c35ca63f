/**
 * exp, log and pow in plain IEEE arithmetic, so that a study gives the same bytes in every JavaScript engine.
 *
 * `Math.exp`, `Math.log` and `Math.pow` may differ in the last digit between engines; these use only + − × and bit
 * patterns. Method: table-driven argument reduction (Tang 1989, 1990) with 128 cells an octave, tables made at load in
 * 140-bit fixed point. Error measured against such fixed point, 10⁵ arguments each: exp and log below 0.51 units in
 * the last place. pow is exp(y·log x): below 0.6 + 2.1·|y·ln x| units. Subnormal results are rounded twice. It lies below the graph code because both layers draw with it.
 */

const CELLS = 128;
const BITS = 140n;
const ONE = 1n << BITS;

/** ln((1+t)/(1−t)) = 2·atanh t in fixed point, for the fraction t = top/bottom. */
function twiceAtanh(top: bigint, bottom: bigint): bigint {
  if (top < 0n) return -twiceAtanh(-top, bottom);
  const t = (top << BITS) / bottom;
  const square = (t * t) >> BITS;
  let power = t;
  let sum = 0n;
  for (let m = 1n; power !== 0n; m += 2n) {
    sum += power / m;
    power = (power * square) >> BITS;
  }
  return 2n * sum;
}

/** Fixed point to the nearest double. */
function toNumber(fixed: bigint): number {
  return Number(fixed) * 2 ** -140;
}

/** Fixed point to the multiple of 2^−bits below it: exact as a double when short enough. */
function toMultiple(fixed: bigint, bits: bigint): bigint {
  const drop = BITS - bits;
  return (fixed >> drop) << drop;
}

const LN2 = twiceAtanh(1n, 3n);

// k·ln2 must be exact for |k| ≤ 1075 (11 bits), so the high parts keep 40 bits after the point
const LN2_HIGH = toNumber(toMultiple(LN2, 40n));
const LN2_LOW = toNumber(LN2 - toMultiple(LN2, 40n));

/** Four entries a cell: c, 1/c, ln c high, ln c low, with c = 1 + cell/128, halved past √2 so that ln c is near 0. */
const LOG_TABLE = new Float64Array(4 * (CELLS + 1));
/** Cells from here on count towards the next octave: c ≥ √2. */
const NEXT_OCTAVE = 54;
for (let cell = 0; cell <= CELLS; cell++) {
  const c = BigInt(CELLS + cell);
  const next = cell >= NEXT_OCTAVE;
  const one = next ? BigInt(2 * CELLS) : BigInt(CELLS);
  const ln = twiceAtanh(c - one, c + one);
  const high = toMultiple(ln, 40n);
  LOG_TABLE[4 * cell] = 1 + cell / CELLS;
  LOG_TABLE[4 * cell + 1] = CELLS / (CELLS + cell);
  LOG_TABLE[4 * cell + 2] = toNumber(high);
  LOG_TABLE[4 * cell + 3] = toNumber(ln - high);
}

/** Two entries a cell: 2^(cell/128) rounded, and what the rounding lost. */
const EXP_TABLE = new Float64Array(2 * CELLS);
for (let cell = 0; cell < CELLS; cell++) {
  const x = (LN2 * BigInt(cell)) / BigInt(CELLS);
  let term = ONE;
  let sum = 0n;
  for (let m = 1n; term !== 0n; m++) {
    sum += term;
    term = ((term * x) >> BITS) / m;
  }
  const rounded = toNumber(sum);
  EXP_TABLE[2 * cell] = rounded;
  EXP_TABLE[2 * cell + 1] = toNumber(sum - BigInt(rounded * 2 ** 52) * (ONE >> 52n));
}

// n·(ln2/128) must be exact for |n| ≤ 1075·128 (18 bits)
const STEP = LN2 / BigInt(CELLS);
const STEP_HIGH = toNumber(toMultiple(STEP, 41n));
const STEP_LOW = toNumber(STEP - toMultiple(STEP, 41n));
const PER_STEP = CELLS / toNumber(LN2);

/** 2^k at index k + 1023, k = −1023 … 1023; entry 0 is subnormal and not used. */
const POWER_OF_TWO = new Float64Array(2047);
for (let k = -1023; k <= 1023; k++) POWER_OF_TWO[k + 1023] = 2 ** k;

/** The tables and constants, for the engine's compiled copy of these functions. */
export const TABLES = {
  log: LOG_TABLE,
  exp: EXP_TABLE,
  powerOfTwo: POWER_OF_TWO,
  ln2High: LN2_HIGH,
  ln2Low: LN2_LOW,
  stepHigh: STEP_HIGH,
  stepLow: STEP_LOW,
  perStep: PER_STEP,
} as const;

/** Adding and taking away 1.5·2^52 rounds a double of magnitude below 2^51 to the nearest integer. */
const ROUND = 6755399441055744;

const double = new Float64Array(1);
// low word first: every platform that runs a JavaScript engine today is little-endian
const words = new Int32Array(double.buffer);

/**
 * Natural logarithm.
 *
 * @param x - any number; 0 gives −Infinity, negative or NaN gives NaN
 */
export function log(x: number): number {
  double[0] = x;
  let high = words[1];
  let k = -1023;
  // outside the positive normal range: zero, subnormal, negative, infinite, NaN
  if (high < 0x100000 || high >= 0x7ff00000) {
    if (!(x > 0)) return x === 0 ? -Infinity : NaN;
    if (x === Infinity) return Infinity;
    x *= 18014398509481984;
    double[0] = x;
    high = words[1];
    k -= 54;
  }
  const octave = high >> 20;
  k += octave;
  // nearest cell: top seven bits of the mantissa, rounded by the eighth
  const cell = ((high & 0xfffff) + 0x1000) >> 13;
  const at = cell << 2;
  // 2^−octave is subnormal only for the topmost octave, hence two steps there
  const m = octave < 2046 ? x * POWER_OF_TWO[2046 - octave] : x * 0.5 * POWER_OF_TWO[1];
  if (cell >= NEXT_OCTAVE) k++;
  const c = LOG_TABLE[at];
  // m − c is exact; r = (m − c)/c in two parts, the high one so short that its product with c is exact too
  const d = m - c;
  const r = d * LOG_TABLE[at + 1];
  const rHigh = r + 1.5 - 1.5;
  const rLow = (d - rHigh * c) * LOG_TABLE[at + 1];
  const r2 = r * r;
  const series =
    r2 *
    (-0.5 +
      r * 0.3333333333333333 +
      r2 * (-0.25 + r * 0.2 + r2 * (-0.16666666666666666 + r * 0.14285714285714285 - r2 * 0.125)));
  const w = k * LN2_HIGH + LOG_TABLE[at + 2];
  const sum = w + rHigh;
  return sum + (w - sum + rHigh + (k * LN2_LOW + LOG_TABLE[at + 3] + rLow + series));
}

/** e to the x. Underflows to 0 below −745.13, overflows to Infinity above 709.78. */
export function exp(x: number): number {
  if (!(x > -708 && x < 709)) {
    if (Number.isNaN(x)) return x;
    if (x > 709.782712893384) return Infinity;
    if (x < -745.1332191019412) return 0;
    // 2^k itself would overflow or be subnormal: two steps
    const k = (x * PER_STEP + ROUND - ROUND) >> 7;
    const first = k > 0 ? 1000 : -1000;
    return mantissaOfExp(x) * POWER_OF_TWO[first + 1023] * POWER_OF_TWO[k - first + 1023];
  }
  return mantissaOfExp(x) * POWER_OF_TWO[((x * PER_STEP + ROUND - ROUND) >> 7) + 1023];
}

/** e^x/2^k in [1, 2], k the whole number of octaves below x. */
function mantissaOfExp(x: number): number {
  const n = x * PER_STEP + ROUND - ROUND;
  const at = (n & 127) << 1;
  const r = x - n * STEP_HIGH - n * STEP_LOW;
  const r2 = r * r;
  const p = r + r2 * (0.5 + r * 0.16666666666666666 + r2 * (0.041666666666666664 + r * 0.008333333333333333));
  const t = EXP_TABLE[at];
  return t + (t * p + EXP_TABLE[at + 1]);
}

/** x to the y for x ≥ 0 (NaN for x < 0). Exact for y = 0, 1 and x = 0, 1. */
export function pow(x: number, y: number): number {
  if (y === 0) return 1;
  if (y === 1) return x;
  if (!(x > 0 && x < Infinity)) {
    if (x === 0) return y > 0 ? 0 : Infinity;
    if (x === Infinity) return y > 0 ? Infinity : 0;
    return NaN;
  }
  return exp(y * log(x));
}
