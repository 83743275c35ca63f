/**
 * The engine's inner loops in AssemblyScript, compiled to WebAssembly: draws, shocks and the planned choice.
 *
 * Operation by operation the same as random/philox.ts, random/draws.ts, random/normal.ts, network/elementary.ts and
 * model/planned.ts, so the bits are the same (tested); it exists for speed, since 64-bit products and register
 * arithmetic are two to five times as fast here. It works on columns of at most CHUNK households at fixed addresses of
 * its memory. Source of bytes.ts: run compile.mjs after any change.
 */

// addresses in bytes; ../kernel.ts repeats them
const LOG_TABLE: usize = 1024;
const EXP_TABLE: usize = 5184;
const POWER_OF_TWO: usize = 7232;
const WEIGHT: usize = 23616;
const SORTED_A: usize = 23648;
const SORTED_PI: usize = 23680;
const CHUNK: usize = 1024;
const COLUMNS: usize = 24576;
const COLUMN: usize = CHUNK * 8;
const WEALTH: usize = COLUMNS;
const CHILD_WEIGHT: usize = COLUMNS + COLUMN;
const PLANNED: usize = COLUMNS + 2 * COLUMN;
const INVESTMENT: usize = COLUMNS + 3 * COLUMN;
const ASPIRATION: usize = COLUMNS + 4 * COLUMN;
const DRAW: usize = COLUMNS + 8 * COLUMN;
const COMMON: usize = COLUMNS + 9 * COLUMN;
const CONSUMPTION: usize = COLUMNS + 10 * COLUMN;
const CHILD_WEALTH: usize = COLUMNS + 11 * COLUMN;
const MET: usize = COLUMNS + 12 * COLUMN;
const REACHED: usize = MET + CHUNK;
const GROWTH: usize = 131072;
const TAIL_INDEX: usize = COMMON;

const ROUND: f64 = 6755399441055744.0;
let LN2_HIGH: f64 = 0;
let LN2_LOW: f64 = 0;
let STEP_HIGH: f64 = 0;
let STEP_LOW: f64 = 0;
let PER_STEP: f64 = 0;

export function setConstants(ln2High: f64, ln2Low: f64, stepHigh: f64, stepLow: f64, perStep: f64): void {
  LN2_HIGH = ln2High;
  LN2_LOW = ln2Low;
  STEP_HIGH = stepHigh;
  STEP_LOW = stepLow;
  PER_STEP = perStep;
}

export function log(x: f64): f64 {
  let bits = reinterpret<u64>(x);
  let high = <i32>(bits >> 32);
  let k: i32 = -1023;
  if (high < 0x100000 || high >= 0x7ff00000) {
    if (!(x > 0)) return x == 0 ? -Infinity : NaN;
    if (x == Infinity) return Infinity;
    x *= 18014398509481984.0;
    bits = reinterpret<u64>(x);
    high = <i32>(bits >> 32);
    k -= 54;
  }
  k += high >> 20;
  const cell = ((high & 0xfffff) + 0x1000) >> 13;
  // the mantissa in [1, 2): the same number as the scaling by a power of two elsewhere
  const m = reinterpret<f64>((bits & 0xfffffffffffff) | 0x3ff0000000000000);
  if (cell >= 54) k++;
  const at = LOG_TABLE + (<usize>cell << 5);
  const c = load<f64>(at);
  const inverse = load<f64>(at, 8);
  const d = m - c;
  const r = d * inverse;
  const rHigh = r + 1.5 - 1.5;
  const rLow = (d - rHigh * c) * inverse;
  const r2 = r * r;
  const series =
    r2 *
    (-0.5 +
      r * 0.3333333333333333 +
      r2 * (-0.25 + r * 0.2 + r2 * (-0.16666666666666666 + r * 0.14285714285714285 - r2 * 0.125)));
  const w = <f64>k * LN2_HIGH + load<f64>(at, 16);
  const sum = w + rHigh;
  return sum + (w - sum + rHigh + (<f64>k * LN2_LOW + load<f64>(at, 24) + rLow + series));
}

export function exp(x: f64): f64 {
  const inside = x > -708 && x < 709;
  if (!inside) {
    if (isNaN(x)) return x;
    if (x > 709.782712893384) return Infinity;
    if (x < -745.1332191019412) return 0;
  }
  const n = x * PER_STEP + ROUND - ROUND;
  const whole = <i32>n;
  const at = EXP_TABLE + (<usize>(whole & 127) << 4);
  const r = x - n * STEP_HIGH - n * STEP_LOW;
  const r2 = r * r;
  const p = r + r2 * (0.5 + r * 0.16666666666666666 + r2 * (0.041666666666666664 + r * 0.008333333333333333));
  const t = load<f64>(at);
  const mantissa = t + (t * p + load<f64>(at, 8));
  const k = whole >> 7;
  if (inside) return mantissa * load<f64>(POWER_OF_TWO + (<usize>(k + 1023) << 3));
  const first = k > 0 ? 1000 : -1000;
  return (
    mantissa *
    load<f64>(POWER_OF_TWO + (<usize>(first + 1023) << 3)) *
    load<f64>(POWER_OF_TWO + (<usize>(k - first + 1023) << 3))
  );
}

function pow(x: f64, y: f64): f64 {
  if (y == 0) return 1;
  if (y == 1) return x;
  if (!(x > 0 && x < Infinity)) {
    if (x == 0) return y > 0 ? 0 : Infinity;
    if (x == Infinity) return y > 0 ? Infinity : 0;
    return NaN;
  }
  return exp(y * log(x));
}

function tailQuantile(q: f64, u: f64): f64 {
  let r = sqrt(-log(q < 0 ? u : 1 - u));
  let x: f64;
  if (r <= 5) {
    r -= 1.6;
    x =
      (((((((r * 7.7454501427834140764e-4 + 0.0227238449892691845833) * r + 0.24178072517745061177) * r +
        1.27045825245236838258) *
        r +
        3.64784832476320460504) *
        r +
        5.7694972214606914055) *
        r +
        4.6303378461565452959) *
        r +
        1.42343711074968357734) /
      (((((((r * 1.05075007164441684324e-9 + 5.475938084995344946e-4) * r + 0.0151986665636164571966) * r +
        0.14810397642748007459) *
        r +
        0.68976733498510000455) *
        r +
        1.6763848301838038494) *
        r +
        2.05319162663775882187) *
        r +
        1);
  } else {
    r -= 5;
    x =
      (((((((r * 2.01033439929228813265e-7 + 2.71155556874348757815e-5) * r + 0.0012426609473880784386) * r +
        0.026532189526576123093) *
        r +
        0.29656057182850489123) *
        r +
        1.7848265399172913358) *
        r +
        5.4637849111641143699) *
        r +
        6.6579046435011037772) /
      (((((((r * 2.04426310338993978564e-15 + 1.4215117583164458887e-7) * r + 1.8463183175100546818e-5) * r +
        7.868691311456132591e-4) *
        r +
        0.0148753612908506148525) *
        r +
        0.13692988092273580531) *
        r +
        0.59983220655588793769) *
        r +
        1);
  }
  return q < 0 ? -x : x;
}

@inline
function two(x: f64): v128 {
  return f64x2.splat(x);
}

/** (high·2^26 + low + ½)·2^−52 of the top 26 bits of two words, for lanes 0 and 1. */
@inline
function toUniforms(high: v128, low: v128): v128 {
  const h = f64x2.convert_low_i32x4_u(i32x4.shr_u(high, 6));
  const l = f64x2.convert_low_i32x4_u(i32x4.shr_u(low, 6));
  return f64x2.mul(f64x2.add(f64x2.add(f64x2.mul(h, two(67108864)), l), two(0.5)), two(2.220446049250313e-16));
}

/** Lanes 2 and 3 moved to 0 and 1. */
@inline
function lastTwo(v: v128): v128 {
  return v128.shuffle<i32>(v, v, 2, 3, 2, 3);
}

/** DRAW[i] = uniform (or normal) of household first + i, for a `first` divisible by 8; writes up to the next 8. */
export function draw(
  normals: bool,
  first: u32,
  count: i32,
  generation: u32,
  replicate: u32,
  purpose: u32,
  low: u32,
  high: u32,
): void {
  const m0 = i32x4.splat(0xd2511f53);
  const m1 = i32x4.splat(0xcd9e8d57);
  const w0 = i32x4.splat(0x9e3779b9);
  const w1 = i32x4.splat(0xbb67ae85);
  for (let i = 0; i < count; i += 8) {
    // four counters at once, one a lane
    let c0 = i32x4.add(i32x4.splat((first + <u32>i) >>> 1), i32x4(0, 1, 2, 3));
    let c1 = i32x4.splat(generation);
    let c2 = i32x4.splat(replicate);
    let c3 = i32x4.splat(purpose);
    let k0 = i32x4.splat(low);
    let k1 = i32x4.splat(high);
    for (let round = 0; round < 10; round++) {
      const p0a = i64x2.extmul_low_i32x4_u(c0, m0);
      const p0b = i64x2.extmul_high_i32x4_u(c0, m0);
      const p1a = i64x2.extmul_low_i32x4_u(c2, m1);
      const p1b = i64x2.extmul_high_i32x4_u(c2, m1);
      c0 = v128.xor(v128.xor(v128.shuffle<i32>(p1a, p1b, 1, 3, 5, 7), c1), k0);
      c1 = v128.shuffle<i32>(p1a, p1b, 0, 2, 4, 6);
      c2 = v128.xor(v128.xor(v128.shuffle<i32>(p0a, p0b, 1, 3, 5, 7), c3), k1);
      c3 = v128.shuffle<i32>(p0a, p0b, 0, 2, 4, 6);
      k0 = i32x4.add(k0, w0);
      k1 = i32x4.add(k1, w1);
    }
    const at = DRAW + (<usize>i << 3);
    let even = toUniforms(c0, c1);
    let odd = toUniforms(c2, c3);
    v128.store(at, v128.shuffle<i64>(even, odd, 0, 2));
    v128.store(at, v128.shuffle<i64>(even, odd, 1, 3), 16);
    even = toUniforms(lastTwo(c0), lastTwo(c1));
    odd = toUniforms(lastTwo(c2), lastTwo(c3));
    v128.store(at, v128.shuffle<i64>(even, odd, 0, 2), 32);
    v128.store(at, v128.shuffle<i64>(even, odd, 1, 3), 48);
  }
  if (normals) quantiles(count);
}

@inline
function horner(p: v128, r: v128, c: f64): v128 {
  return f64x2.add(f64x2.mul(p, r), two(c));
}

/**
 * DRAW[i] = normalQuantile(DRAW[i]): the formula of the middle for everyone, then the tails again with theirs. The tails
 * are listed first (in the space of CONSUMPTION and COMMON), without a branch that cannot be predicted.
 */
function quantiles(count: i32): void {
  let tails: usize = 0;
  for (let i = 0; i < count; i += 2) {
    const at = DRAW + (<usize>i << 3);
    const u = v128.load(at);
    const q = f64x2.sub(u, two(0.5));
    const outside = i64x2.bitmask(f64x2.gt(f64x2.abs(q), two(0.425)));
    const r = f64x2.sub(two(0.180625), f64x2.mul(q, q));
    let p = horner(two(2509.0809287301226727), r, 33430.575583588128105);
    p = horner(p, r, 67265.770927008700853);
    p = horner(p, r, 45921.953931549871457);
    p = horner(p, r, 13731.693765509461125);
    p = horner(p, r, 1971.5909503065514427);
    p = horner(p, r, 133.14166789178437745);
    p = horner(p, r, 3.387132872796366608);
    let d = horner(two(5226.495278852545925), r, 28729.085735721942674);
    d = horner(d, r, 39307.89580009271061);
    d = horner(d, r, 21213.794301586595867);
    d = horner(d, r, 5394.1960214247511077);
    d = horner(d, r, 687.1870074920579083);
    d = horner(d, r, 42.313330701600911252);
    d = horner(d, r, 1);
    v128.store(at, f64x2.div(f64x2.mul(q, p), d));
    store<f64>(CONSUMPTION + (tails << 3), f64x2.extract_lane(u, 0));
    store<u16>(TAIL_INDEX + (tails << 1), <u16>i);
    tails += <usize>(outside & 1);
    store<f64>(CONSUMPTION + (tails << 3), f64x2.extract_lane(u, 1));
    store<u16>(TAIL_INDEX + (tails << 1), <u16>(i + 1));
    tails += <usize>(outside >>> 1);
  }
  for (let t: usize = 0; t < tails; t++) {
    const u = load<f64>(CONSUMPTION + (t << 3));
    store<f64>(DRAW + (<usize>load<u16>(TAIL_INDEX + (t << 1)) << 3), tailQuantile(u - 0.5, u));
  }
}

/** exp of two lanes. */
function exps(x: v128): v128 {
  const inside = v128.and(f64x2.gt(x, two(-708)), f64x2.lt(x, two(709)));
  if (i64x2.bitmask(inside) != 3) return f64x2(exp(f64x2.extract_lane(x, 0)), exp(f64x2.extract_lane(x, 1)));
  const n = f64x2.sub(f64x2.add(f64x2.mul(x, two(PER_STEP)), two(ROUND)), two(ROUND));
  const whole = i32x4.trunc_sat_f64x2_s_zero(n);
  const r = f64x2.sub(f64x2.sub(x, f64x2.mul(n, two(STEP_HIGH))), f64x2.mul(n, two(STEP_LOW)));
  const r2 = f64x2.mul(r, r);
  const inner = f64x2.add(two(0.041666666666666664), f64x2.mul(r, two(0.008333333333333333)));
  const outer = f64x2.add(f64x2.add(two(0.5), f64x2.mul(r, two(0.16666666666666666))), f64x2.mul(r2, inner));
  const p = f64x2.add(r, f64x2.mul(r2, outer));
  const a0 = i32x4.extract_lane(whole, 0);
  const a1 = i32x4.extract_lane(whole, 1);
  const entry0 = v128.load(EXP_TABLE + (<usize>(a0 & 127) << 4));
  const entry1 = v128.load(EXP_TABLE + (<usize>(a1 & 127) << 4));
  const t = v128.shuffle<i64>(entry0, entry1, 0, 2);
  const lost = v128.shuffle<i64>(entry0, entry1, 1, 3);
  const mantissa = f64x2.add(t, f64x2.add(f64x2.mul(t, p), lost));
  const scales = f64x2(
    load<f64>(POWER_OF_TWO + (<usize>((a0 >> 7) + 1023) << 3)),
    load<f64>(POWER_OF_TWO + (<usize>((a1 >> 7) + 1023) << 3)),
  );
  return f64x2.mul(mantissa, scales);
}

/** DRAW[i] = exp(own·DRAW[i] + shift). */
export function shocks(count: i32, own: f64, shift: f64): void {
  for (let i = 0; i < count; i += 2) {
    const at = DRAW + (<usize>i << 3);
    v128.store(at, exps(f64x2.add(f64x2.mul(two(own), v128.load(at)), two(shift))));
  }
}

/** DRAW[i] = exp(shared·COMMON[i] + own·DRAW[i] + shift). */
export function sharedShocks(count: i32, own: f64, shared: f64, shift: f64): void {
  for (let i = 0; i < count; i += 2) {
    const at = DRAW + (<usize>i << 3);
    const common = f64x2.mul(two(shared), v128.load(COMMON + (<usize>i << 3)));
    const x = f64x2.add(f64x2.add(common, f64x2.mul(two(own), v128.load(at))), two(shift));
    v128.store(at, exps(x));
  }
}

/** Choices by the growth table in GROWTH, two at a time and both branches for each: growth-table.ts. */
export function chooseByTable(count: i32, cells: i32, threshold_: f64, low: f64, grossReturn: f64): void {
  const last = i32x4.splat(cells - 1);
  for (let i = 0; i < count; i += 2) {
    const at = <usize>i << 3;
    const y = v128.load(WEALTH + at);
    const aim = v128.load(ASPIRATION + at);
    const q = f64x2.div(aim, y);
    const strives = f64x2.le(q, two(threshold_));
    const position = f64x2.mul(f64x2.div(f64x2.pmax(q, two(0)), two(threshold_)), two(<f64>cells));
    const cell = i32x4.min_s(i32x4.trunc_sat_f64x2_s_zero(position), last);
    const x = f64x2.sub(position, f64x2.convert_low_i32x4_s(cell));
    const one = GROWTH + <usize>i32x4.extract_lane(cell, 0) * 48;
    const other = GROWTH + <usize>i32x4.extract_lane(cell, 1) * 48;
    let g = v128.shuffle<i64>(v128.load(one, 32), v128.load(other, 32), 1, 3);
    g = f64x2.add(v128.shuffle<i64>(v128.load(one, 32), v128.load(other, 32), 0, 2), f64x2.mul(x, g));
    g = f64x2.add(v128.shuffle<i64>(v128.load(one, 16), v128.load(other, 16), 1, 3), f64x2.mul(x, g));
    g = f64x2.add(v128.shuffle<i64>(v128.load(one, 16), v128.load(other, 16), 0, 2), f64x2.mul(x, g));
    g = f64x2.add(v128.shuffle<i64>(v128.load(one), v128.load(other), 1, 3), f64x2.mul(x, g));
    g = f64x2.add(v128.shuffle<i64>(v128.load(one), v128.load(other), 0, 2), f64x2.mul(x, g));
    const striving = f64x2.pmax(f64x2.mul(g, y), aim);
    const z = v128.bitselect(striving, f64x2.mul(two(low), y), strives);
    const met = i64x2.bitmask(strives);
    store<u16>(MET + <usize>i, <u16>((met & 1) | ((met & 2) << 7)));
    v128.store(PLANNED + at, z);
    v128.store(INVESTMENT + at, f64x2.div(z, two(grossReturn)));
  }
}

/** CONSUMPTION, CHILD_WEALTH and REACHED from the choice and the shocks in DRAW. */
export function outcome(count: i32, milestones_: i32): void {
  for (let i = 0; i < count; i++) {
    const at = <usize>i << 3;
    store<f64>(CONSUMPTION + at, load<f64>(WEALTH + at) - load<f64>(INVESTMENT + at));
    const child = load<f64>(PLANNED + at) * load<f64>(DRAW + at);
    store<f64>(CHILD_WEALTH + at, child);
    let reached: i32 = 0;
    for (let m = 0; m < milestones_; m++) {
      reached += <i32>(child >= load<f64>(ASPIRATION + <usize>m * COLUMN + at));
    }
    store<u8>(REACHED + <usize>i, <u8>reached);
  }
}

let linear: bool = false;
let threshold: bool = false;
let scale: f64 = 0;
let alpha: f64 = 0;
let kept: f64 = 0;
let sigma: f64 = 0;
let eta: f64 = 0;
let lambda: f64 = 0;
let milestones: i32 = 0;

export function setProblem(
  isLinear: bool,
  isThreshold: bool,
  scale_: f64,
  alpha_: f64,
  kept_: f64,
  sigma_: f64,
  eta_: f64,
  lambda_: f64,
  milestones_: i32,
): void {
  linear = isLinear;
  threshold = isThreshold;
  scale = scale_;
  alpha = alpha_;
  kept = kept_;
  sigma = sigma_;
  eta = eta_;
  lambda = lambda_;
  milestones = milestones_;
}

// the answer of one household, and φ′ and φ″ of the last evaluation
let planned: f64 = 0;
let investment: f64 = 0;
let met: i32 = 0;
let slope: f64 = 0;
let curvature: f64 = 0;

@inline
function a(m: i32): f64 {
  return load<f64>(SORTED_A + (<usize>m << 3));
}

@inline
function pi(m: i32): f64 {
  return load<f64>(SORTED_PI + (<usize>m << 3));
}

/** Choices of the households in WEALTH, CHILD_WEIGHT and ASPIRATION; fills PLANNED, INVESTMENT and MET. */
export function choose(count: i32): void {
  for (let i = 0; i < count; i++) {
    const at = <usize>i << 3;
    for (let m = 0; m < milestones; m++) {
      const value = load<f64>(ASPIRATION + <usize>m * COLUMN + at);
      let place = m;
      while (place > 0 && a(place - 1) > value) {
        store<f64>(SORTED_A + (<usize>place << 3), a(place - 1));
        store<f64>(SORTED_PI + (<usize>place << 3), pi(place - 1));
        place--;
      }
      store<f64>(SORTED_A + (<usize>place << 3), value);
      store<f64>(SORTED_PI + (<usize>place << 3), load<f64>(WEIGHT + (<usize>m << 3)));
    }
    const y = load<f64>(WEALTH + at);
    const delta = load<f64>(CHILD_WEIGHT + at);
    if (threshold) solveThreshold(y, delta);
    else solveGainLoss(y, delta);
    store<f64>(PLANNED + at, planned);
    store<f64>(INVESTMENT + at, investment);
    store<u8>(MET + <usize>i, <u8>met);
  }
}

function childWealth(k: f64): f64 {
  return linear ? scale * k : scale * pow(k, alpha) + kept * k;
}

function investmentFor(z: f64): f64 {
  if (!(z > 0)) return 0;
  if (linear) return z / scale;
  if (kept == 0) return pow(z / scale, 1 / alpha);
  let k = min(pow((0.5 * z) / scale, 1 / alpha), (0.5 * z) / kept);
  for (let step = 0; step < 200; step++) {
    const power = scale * pow(k, alpha);
    const move = (z - power - kept * k) / ((alpha * power) / k + kept);
    k += move;
    if (!(abs(move) > 1e-9 * k)) break;
  }
  return k;
}

function crra(x: f64): f64 {
  if (sigma == 1) return log(x);
  const power = 1 - sigma;
  if (x == 0) return power > 0 ? 0 : -Infinity;
  return exp(power * log(x)) / power;
}

function utilityAt(c: f64, z: f64, delta: f64, count: i32): f64 {
  let value = crra(z);
  const power = 1 - eta;
  for (let m = 0; m < count; m++) {
    const above = z - a(m);
    if (above > 0) value += (pi(m) * exp(power * log(above))) / power;
  }
  return crra(c) + delta * value;
}

function evaluate(k: f64, z: f64, y: f64, delta: f64, count: i32): f64 {
  let marginal = scale;
  let bend: f64 = 0;
  let bendSlope: f64 = 0;
  if (!linear) {
    const power = (alpha * (z - kept * k)) / k;
    marginal = power + kept;
    bend = ((alpha - 1) * power) / (k * marginal);
    bendSlope = bend * ((alpha - 2) / k - bend);
  }
  let s = exp(-sigma * log(z));
  let fall = (sigma * s) / z;
  let fall2 = ((sigma + 1) * fall) / z;
  for (let m = 0; m < count; m++) {
    const above = z - a(m);
    if (!(above > 0)) {
      if (pi(m) == 0) continue;
      slope = Infinity;
      curvature = 0;
      return k - y;
    }
    const term = pi(m) * exp(-eta * log(above));
    const first = (eta * term) / above;
    s += term;
    fall += first;
    fall2 += ((eta + 1) * first) / above;
  }
  const p = exp(log(delta * marginal * s) / -sigma);
  const drop = (marginal * fall) / s;
  const l = (drop - bend) / sigma;
  const l2 = (drop * (drop + bend) - (marginal * marginal * fall2) / s - bendSlope) / sigma;
  slope = 1 + p * l;
  curvature = p * (l * l + l2);
  return p - (y - k);
}

function start(low: f64, high: f64, atHigh: f64, y: f64, delta: f64, count: i32): f64 {
  let k = atHigh > 0 ? low + ((high - low) * (y - low)) / (y - low + atHigh) : 0.5 * (low + high);
  if (linear && eta == sigma) {
    const kappa = exp(log(delta * scale) / sigma);
    const bare = y / (1 + scale / kappa);
    if (bare > k || count == 0) k = bare;
    for (let m = 0; m < count; m++) {
      if (pi(m) == 0) continue;
      const kappaM = kappa * exp(log(pi(m)) / sigma);
      const alone = (a(m) + kappaM * y) / (scale + kappaM);
      if (alone > k) k = alone;
    }
  }
  return k > low && k < high ? k : 0.5 * (low + high);
}

function root(low: f64, high: f64, atHigh: f64, y: f64, delta: f64, count: i32): f64 {
  const from = low;
  let k = start(low, high, atHigh, y, delta, count);
  let lastMove = high - low;
  for (let step = 0; step < 200; step++) {
    const value = evaluate(k, childWealth(k), y, delta, count);
    if (value == 0) return k;
    if (value < 0) low = k;
    else high = k;
    let move = -value / slope;
    const bendBy = 1 - (0.5 * value * curvature) / (slope * slope);
    if (bendBy > 0.2 && bendBy < 5) move /= bendBy;
    let next = k + move;
    if (abs(move) <= 1e-4 * min(k - from, y - k)) return next < low ? low : next > high ? high : next;
    if (!(next > low && next < high) || abs(move) > 0.7 * lastMove) {
      next = 0.5 * (low + high);
      move = next - k;
    }
    lastMove = abs(move);
    if (next == k || next <= low || next >= high) return k;
    k = next;
  }
  return k;
}

function solveThreshold(y: f64, delta: f64): void {
  const M = milestones;
  const reach = childWealth(y);
  let best = -Infinity;
  let kLow: f64 = 0;
  for (let j = 0; j <= M; j++) {
    const lower = j > 0 ? a(j - 1) : 0;
    const upper = j < M ? a(j) : Infinity;
    if (lower >= reach) break;
    if (!(upper > lower) || upper <= 0) continue;
    let kHigh = y;
    let atHigh: f64 = 0;
    if (upper < reach) {
      kHigh = investmentFor(upper);
      if (!(kHigh > 1e-200 * y)) continue;
      atHigh = evaluate(kHigh, upper, y, delta, j);
      if (atHigh < 0) {
        kLow = kHigh;
        continue;
      }
    }
    const bare = kLow > 0 && pi(j - 1) == 0;
    if (!bare || evaluate(kLow, lower, y, delta, j) < 0) {
      const k = root(kLow, kHigh, atHigh, y, delta, j);
      let z = childWealth(k);
      if (z < lower) z = lower;
      let count = j;
      if (z >= upper) {
        z = upper;
        while (count < M && a(count) <= z) count++;
      }
      const utility = utilityAt(y - k, z, delta, j);
      if (utility >= best) {
        best = utility;
        planned = z;
        investment = k;
        met = count;
      }
    }
    kLow = kHigh;
  }
}

function solveGainLoss(y: f64, delta: f64): void {
  const M = milestones;
  const reach = childWealth(y);
  let kLow: f64 = 0;
  for (let j = 0; j <= M; j++) {
    const lower = j > 0 ? a(j - 1) : 0;
    const upper = j < M ? a(j) : Infinity;
    if (j < M && upper <= 0) continue;
    let factor: f64 = 1;
    for (let m = 0; m < M; m++) factor += m < j ? pi(m) : lambda * pi(m);
    const weight = delta * factor;
    let kHigh = y;
    let atHigh: f64 = 0;
    if (upper < reach) {
      kHigh = investmentFor(upper);
      if (!(kHigh > 1e-200 * y)) continue;
      atHigh = evaluate(kHigh, upper, y, weight, 0);
      if (atHigh < 0) {
        kLow = kHigh;
        continue;
      }
    }
    let k: f64;
    let z: f64;
    if (kLow > 0 && evaluate(kLow, lower, y, weight, 0) >= 0) {
      k = kLow;
      z = lower;
    } else {
      k = root(kLow, kHigh, atHigh, y, weight, 0);
      z = childWealth(k);
      if (z < lower) z = lower;
      if (z > upper) z = upper;
    }
    let count = 0;
    while (count < M && a(count) <= z) count++;
    planned = z;
    investment = k;
    met = count;
    return;
  }
}
