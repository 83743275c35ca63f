/**
 * Errors a user can mend: something in a file, a study or a command is wrong.
 *
 * An `InputError` carries one or more problems, each with the place it was found, what is wrong and what
 * to do, and is shown without a stack. A bug raises any other error and shows its stack.
 */

/** One thing that is wrong with what the user gave. */
export interface Problem {
  /** Stable short name, kebab case, for tests and `--json`: `unknown-key`, `duplicate-tie`, … */
  readonly code: string;
  /** Where: `study.yaml:14:7`, `households.csv row 212 column wealth`, `--threads`. */
  readonly place: string;
  /** What is wrong, with the offending value. */
  readonly problem: string;
  /** What to do about it. */
  readonly remedy: string;
}

/** Formats a problem as `where: what is wrong; what to do`. */
export function describe(problem: Problem): string {
  return `${problem.place}: ${problem.problem}; ${problem.remedy}`;
}

/** The request or its data are wrong (exit status 2). Nothing has been written when it is raised. */
export class InputError extends Error {
  override readonly name = 'InputError';
  readonly problems: readonly Problem[];

  constructor(problems: Problem | readonly Problem[]) {
    const list: readonly Problem[] = Array.isArray(problems) ? problems : [problems as Problem];
    super(list.map(describe).join('\n'));
    this.problems = list;
  }
}

/** An array does not have the length its role requires: a mistake in a call, not in a user's file. */
export class ShapeError extends RangeError {
  override readonly name = 'ShapeError';

  constructor(what: string, got: number, expected: number, why: string) {
    super(`${what} has length ${got}, expected ${expected} (${why})`);
  }
}

/** The nearest of `names` to a mistyped `word` (edit distance, at most a third of its length + 1), or undefined. */
export function nearest(word: string, names: Iterable<string>): string | undefined {
  let best: string | undefined;
  let bestDistance = Math.floor(word.length / 3) + 2;
  for (const name of names) {
    const d = editDistance(word.toLowerCase(), name.toLowerCase());
    if (d < bestDistance) {
      best = name;
      bestDistance = d;
    }
  }
  return best;
}

/** Edit distance with neighbouring letters swapped counting as one (optimal string alignment). */
function editDistance(a: string, b: string): number {
  const rows: number[][] = [];
  for (let i = 0; i <= a.length; i++) {
    const row: number[] = [i];
    for (let j = 1; j <= b.length; j++) {
      if (i === 0) {
        row.push(j);
        continue;
      }
      const same = a[i - 1] === b[j - 1];
      let d = Math.min(rows[i - 1][j] + 1, row[j - 1] + 1, rows[i - 1][j - 1] + (same ? 0 : 1));
      if (i > 1 && j > 1 && a[i - 1] === b[j - 2] && a[i - 2] === b[j - 1]) d = Math.min(d, rows[i - 2][j - 2] + 1);
      row.push(d);
    }
    rows.push(row);
  }
  return rows[a.length][b.length];
}

/** The work failed though the request was right (exit status 1): shown without a stack. */
export class RunError extends Error {
  override readonly name = 'RunError';

  constructor(place: string, problem: string, remedy: string) {
    super(`${place}: ${problem}; ${remedy}`);
  }
}
