/**
 * The luck that falls on planned child wealth: ln ε = s(√ω·ξ_place + √(1−ω)·ξ_household) − s²/2, so E ε = 1.
 *
 * Draws are functions of household, place and generation (random/draws.ts): arms of a study share them.
 */
import { exp } from '../../network/elementary.js';
import { CHUNK, type Kernel, kernel } from '../kernel/kernel.js';
import type { Draws } from '../random/draws.js';
import type { Households, Shock } from './types.js';

/**
 * Fills out[i] with ε of household i in a generation; all 1 when there is no shock.
 *
 * @param out - length n, overwritten. Cost O(n); allocates one number a place when places share luck.
 */
export function drawShocks(
  shock: Shock,
  households: Households,
  draws: Draws,
  generation: number,
  out: Float64Array,
): void {
  const n = out.length;
  const common = placeShocks(shock, households, draws, generation);
  const compiled = kernel();
  if (compiled === null) {
    plainShocks(shock, households, common, draws, generation, out);
    return;
  }
  for (let first = 0; first < n; first += CHUNK) {
    const count = Math.min(CHUNK, n - first);
    shockChunk(compiled, shock, households, common, draws, generation, first, count);
    out.set(count === CHUNK ? compiled.draws : compiled.draws.subarray(0, count), first);
  }
}

/** ξ of every place in a generation, or null when places share no luck. */
export function placeShocks(
  shock: Shock,
  households: Households,
  draws: Draws,
  generation: number,
): Float64Array | null {
  if (!(shock.sdLog > 0 && shock.sharedByPlace > 0)) return null;
  const common = new Float64Array(households.places);
  draws.normals('placeShock', generation, common);
  return common;
}

/** Leaves ε of households first … first + count − 1 in the kernel's `draws`; `first` a multiple of CHUNK. */
export function shockChunk(
  compiled: Kernel,
  shock: Shock,
  households: Households,
  common: Float64Array | null,
  draws: Draws,
  generation: number,
  first: number,
  count: number,
): void {
  const s = shock.sdLog;
  if (!(s > 0)) {
    compiled.draws.fill(1);
    return;
  }
  const shift = -0.5 * s * s;
  const own = s * Math.sqrt(1 - shock.sharedByPlace);
  draws.chunk(compiled, true, 'householdShock', generation, first, count);
  if (common === null) {
    compiled.call.shocks(count, own, shift);
    return;
  }
  const place = households.place;
  const column = compiled.common;
  for (let i = 0; i < count; i++) column[i] = common[place[first + i]];
  compiled.call.sharedShocks(count, own, s * Math.sqrt(shock.sharedByPlace), shift);
}

/** The same shocks without the kernel. */
export function plainShocks(
  shock: Shock,
  households: Households,
  common: Float64Array | null,
  draws: Draws,
  generation: number,
  out: Float64Array,
): void {
  const s = shock.sdLog;
  const n = out.length;
  if (!(s > 0)) {
    out.fill(1);
    return;
  }
  const shift = -0.5 * s * s;
  const own = s * Math.sqrt(1 - shock.sharedByPlace);
  const shared = s * Math.sqrt(shock.sharedByPlace);
  draws.normals('householdShock', generation, out);
  if (common === null) for (let i = 0; i < n; i++) out[i] = exp(own * out[i] + shift);
  else {
    const place = households.place;
    for (let i = 0; i < n; i++) out[i] = exp(shared * common[place[i]] + own * out[i] + shift);
  }
}
