/**
 * What became of frustrated households: do pockets hold their members, and would these be satisfied elsewhere?
 *
 * Follows statuses by household from one generation to the next, and across to the other arm.
 */

/** Shares, NaN where there is nobody to follow. */
export interface Fates {
  /** Of last generation's core members of pockets, the share frustrated now. */
  readonly pocketPersistence: number;
  /** Of last generation's frustrated households, the share frustrated now. */
  readonly frustrationPersistence: number;
  /** Of the core members of pockets now, the share satisfied in the other arm now. */
  readonly satisfiedElsewhere: number;
}

/** A generation's statuses by household. */
export interface Statuses {
  /** 1 where no milestone is met. */
  readonly frustrated: Uint8Array;
  /** 1 core member of a pocket, 2 fringe, 0 neither. */
  readonly role: Uint8Array;
}

/**
 * @param now - this generation
 * @param before - the one before, or null at the start
 * @param other - who is frustrated in the other arm now, or null where there is none
 */
export function fatesOf(now: Statuses, before: Statuses | null, other: Uint8Array | null): Fates {
  const { frustrated, role } = now;
  let members = 0;
  let held = 0;
  let were = 0;
  let stayed = 0;
  let core = 0;
  let elsewhere = 0;
  for (let i = 0; i < frustrated.length; i++) {
    if (before !== null && before.role[i] === 1) {
      members++;
      held += frustrated[i];
    }
    if (before !== null && before.frustrated[i] === 1) {
      were++;
      stayed += frustrated[i];
    }
    if (role[i] === 1) {
      core++;
      if (other !== null) elsewhere += 1 - other[i];
    }
  }
  return {
    pocketPersistence: members > 0 ? held / members : NaN,
    frustrationPersistence: were > 0 ? stayed / were : NaN,
    satisfiedElsewhere: core > 0 && other !== null ? elsewhere / core : NaN,
  };
}
