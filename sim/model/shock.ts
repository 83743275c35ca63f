/**
 * The luck that falls on planned child wealth: ln ε = s(√ω·ξ_place + √(1−ω)·ξ_household) − s²/2, so E ε = 1.
 *
 * Draws are functions of household, place and generation (random/draws.ts): arms of a study share them.
 */
import { exp } from '../../network/elementary.js';
import { CHUNK, kernel } from '../kernel/kernel.js';
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
  const s = shock.sdLog;
  const n = out.length;
  if (!(s > 0)) {
    out.fill(1);
    return;
  }
  const shift = -0.5 * s * s;
  const own = s * Math.sqrt(1 - shock.sharedByPlace);
  const shared = s * Math.sqrt(shock.sharedByPlace);
  const place = households.place;
  let common: Float64Array | null = null;
  if (shared > 0) {
    common = new Float64Array(households.places);
    draws.normals('placeShock', generation, common);
  }
  const compiled = kernel();
  if (compiled === null) {
    draws.normals('householdShock', generation, out);
    if (common === null) for (let i = 0; i < n; i++) out[i] = exp(own * out[i] + shift);
    else for (let i = 0; i < n; i++) out[i] = exp(shared * common[place[i]] + own * out[i] + shift);
    return;
  }
  for (let first = 0; first < n; first += CHUNK) {
    const count = Math.min(CHUNK, n - first);
    draws.chunk(compiled, true, 'householdShock', generation, first, count);
    if (common === null) compiled.call.shocks(count, own, shift);
    else {
      const column = compiled.common;
      for (let i = 0; i < count; i++) column[i] = common[place[first + i]];
      compiled.call.sharedShocks(count, own, shared, shift);
    }
    out.set(count === CHUNK ? compiled.draws : compiled.draws.subarray(0, count), first);
  }
}
