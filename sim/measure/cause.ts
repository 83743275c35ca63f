/**
 * Why a household is frustrated: its narrow reference, or its place in society.
 *
 * Compares each household's choice with the one it would make, all else equal, under the society-wide mean. The other
 * choice comes from the model; this only names the four outcomes.
 */
import { ShapeError } from '../../network/errors.js';

/** Codes of `cause`: `CAUSES[code]` is the panel's text. */
export const CAUSES = ['', 'local', 'general'] as const;

/** One generation's causes, by household. */
export interface Causes {
  /** 0 not frustrated, 1 local (frustrated now, would meet a milestone), 2 general (frustrated under both). */
  readonly cause: Uint8Array;
  /** 1 where satisfied now and frustrated under the society-wide mean. */
  readonly sheltered: Uint8Array;
  /** 1 where satisfied now, yet growing more slowly than under the society-wide mean. */
  readonly complacent: Uint8Array;
}

/** Growth must be lower by this relative margin to count as slower: far above the solver's error of 1e−9. */
const SLOWER = 1e-7;

/**
 * Classes households by what another reference would do to them.
 *
 * @param frustrated - 1 where no milestone is met now
 * @param metUnderSociety - milestones met (or 0/1) under the society-wide mean
 * @param growth - planned child wealth / wealth now (planned, not realised: the shock is the same in both)
 * @param growthUnderSociety - the same under the society-wide mean
 */
export function causesOf(
  frustrated: ArrayLike<number>,
  metUnderSociety: ArrayLike<number>,
  growth: ArrayLike<number>,
  growthUnderSociety: ArrayLike<number>,
): Causes {
  const n = frustrated.length;
  for (const [name, column] of Object.entries({ metUnderSociety, growth, growthUnderSociety })) {
    if (column.length !== n) throw new ShapeError(name, column.length, n, 'one value per household');
  }
  const cause = new Uint8Array(n);
  const sheltered = new Uint8Array(n);
  const complacent = new Uint8Array(n);
  for (let i = 0; i < n; i++) {
    const met = metUnderSociety[i] > 0;
    if (frustrated[i] === 1) {
      cause[i] = met ? 1 : 2;
    } else {
      if (!met) sheltered[i] = 1;
      if (growth[i] < growthUnderSociety[i] * (1 - SLOWER)) complacent[i] = 1;
    }
  }
  return { cause, sheltered, complacent };
}
