/** Gathers what is wrong with a file, so that a reader mends it in one go instead of line by line. */
import { InputError, type Problem } from '../errors.js';

/** A reader's list of problems: after this many it stops and says so. */
const MOST = 20;

export class Faults {
  private readonly problems: Problem[] = [];

  /** @throws InputError with everything found so far, once there are twenty */
  add(code: string, place: string, problem: string, remedy: string): void {
    this.problems.push({ code, place, problem, remedy });
    if (this.problems.length >= MOST) this.check();
  }

  /** @throws InputError when anything was found */
  check(): void {
    if (this.problems.length > 0) throw new InputError(this.problems);
  }
}

/** Text of a value in a message: quoted, and cut when long. */
export function shown(text: string): string {
  return JSON.stringify(text.length > 40 ? `${text.slice(0, 39)}…` : text);
}
