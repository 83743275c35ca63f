/**
 * How investment becomes child wealth: z = f(k), its slope and its inverse.
 *
 * Knows nothing of what households want (preferences.ts).
 */
import { pow } from '../../network/elementary.js';
import type { Technology } from './types.js';

/** f(k), planned child wealth of investment k ≥ 0. */
export function childWealthOf(technology: Technology, investment: number): number {
  if (technology.kind === 'linear') return technology.grossReturn * investment;
  return technology.scale * pow(investment, technology.elasticity) + (1 - technology.depreciation) * investment;
}

/** f′(k); infinite at 0 for the concave technology. */
export function marginalReturn(technology: Technology, investment: number): number {
  if (technology.kind === 'linear') return technology.grossReturn;
  return (
    technology.elasticity * technology.scale * pow(investment, technology.elasticity - 1) +
    (1 - technology.depreciation)
  );
}

/**
 * The k with f(k) = z ≥ 0, to the last few places. Newton from the left: f is concave and rising, so its tangents lie
 * above it and no step passes the root.
 */
export function investmentFor(technology: Technology, childWealth: number): number {
  if (!(childWealth > 0)) return 0;
  if (technology.kind === 'linear') return childWealth / technology.grossReturn;
  const { scale, elasticity, depreciation } = technology;
  const kept = 1 - depreciation;
  if (kept === 0) return pow(childWealth / scale, 1 / elasticity);
  // each of the two terms of f is at most z/2 here, so this lies left of the root
  let k = Math.min(pow((0.5 * childWealth) / scale, 1 / elasticity), (0.5 * childWealth) / kept);
  for (let step = 0; step < 200; step++) {
    const power = scale * pow(k, elasticity);
    const move = (childWealth - power - kept * k) / ((elasticity * power) / k + kept);
    k += move;
    if (!(Math.abs(move) > 1e-9 * k)) break;
  }
  return k;
}
