/**
 * The regressions of a plan in the report: what each asked, a coefficient plot, and the table.
 *
 * Reads `estimates.json` as it lies in the folder; runs nothing.
 */
import { type CoefficientStrip, coefficientsFigure } from '../figures/coefficients.js';
import { safe } from '../figures/figure.js';
import { count, fixed, list, NONE, num, p, pct, plate, pValue, sentence, table } from './words.js';

/** The constant as results name it. */
const CONSTANT = '(const)';

interface Term {
  readonly term: string;
  readonly estimate: number;
  readonly std_error: number;
  readonly p_value: number;
  readonly ci_low: number;
  readonly ci_high: number;
}

interface Regression {
  readonly name: string;
  readonly outcome: string;
  readonly arm: string | null;
  readonly replicate: number | null;
  readonly method: 'ols' | 'logit' | 'iv';
  readonly errors: string;
  readonly terms: readonly Term[];
  readonly marginal_effects?: readonly Term[] | null;
  readonly nobs: number;
  readonly r_squared: number | null;
  readonly clusters_by: Readonly<Record<string, number>>;
  readonly absorbed: Readonly<Record<string, number>>;
  readonly level: number;
  readonly notes: readonly string[];
}

interface TermSummary {
  readonly term: string;
  readonly replicates: number;
  readonly mean: number;
  readonly sd: number | null;
  readonly mean_std_error: number;
  readonly se_ratio: number | null;
  readonly rejects_zero: number;
  readonly truth: number | null;
  readonly coverage: number | null;
  readonly anderson_rubin_coverage: number | null;
}

interface Summary {
  readonly name: string;
  readonly method: Regression['method'];
  readonly outcome: string;
  readonly arm: string | null;
  readonly replicates: number;
  readonly failed: number;
  readonly mean_nobs: number;
  readonly weakest_F: number | null;
  readonly median_F: number | null;
  readonly terms: readonly TermSummary[];
  readonly marginal_effects: readonly TermSummary[] | null;
}

/** `estimates.json`, as much of it as the report uses. */
export interface EstimatesFile {
  readonly estimates: readonly Regression[];
  readonly summary: readonly Summary[];
}

/** Null when there is no such file, or it is not one. */
export function parseEstimates(text: string | null): EstimatesFile | null {
  if (text === null) return null;
  try {
    const value = JSON.parse(text) as EstimatesFile;
    return Array.isArray(value.estimates) && Array.isArray(value.summary) && value.summary.length > 0 ? value : null;
  } catch {
    return null;
  }
}

const METHODS = {
  ols: 'least squares',
  logit: 'a logit (which explains the odds of a yes)',
  iv: 'two-stage least squares with instruments',
} as const;

/** The section, without its heading. */
export function estimatesSection(file: EstimatesFile, arms: readonly string[]): string {
  const names = [...new Set(file.summary.map((one) => one.name))];
  const several = file.summary.some((one) => one.replicates > 1);
  const intro =
    'The same regressions a survey of these households would be put to. ' +
    (several
      ? 'Each is run in every replicate. The dot is the mean over replicates, filled where the line leaves zero out; the line ' +
        'spans where 95 % of single replicates would fall (mean ± 1.96 standard deviations). '
      : 'The dot is the estimate, filled where its interval leaves zero out. ') +
    'In the tables, sd is the spread over replicates, s.e. is the standard error a single replicate would report, and “not 0 in” the share of replicates that would call the coefficient different from zero at 5 %. An upright bar marks the true value where it is known. A coefficient is the change in the outcome that goes with one ' +
    'more unit of the term, the other terms held fixed: it is an effect only where the design makes it one.';
  return (
    p(intro) +
    names
      .map((name) =>
        one(
          file.summary.filter((summary) => summary.name === name),
          file.estimates.filter((regression) => regression.name === name),
          arms,
        ),
      )
      .join('\n')
  );
}

function one(summaries: readonly Summary[], regressions: readonly Regression[], arms: readonly string[]): string {
  const first = regressions[0];
  const { name, method, outcome } = summaries[0];
  // one arm needs no name in every row
  const pooled = summaries.length === 1 && (arms.length === 1 || !arms.includes(summaries[0].arm ?? ''));
  const replicates = Math.max(...summaries.map((summary) => summary.replicates));
  const effects = Object.keys(first.absorbed);
  const clusters = Object.keys(first.clusters_by);
  const about =
    `${sentence(termWords(outcome))} by ${METHODS[method]}` +
    `${effects.length > 0 ? `, comparing within ${list(effects)}` : ''}` +
    `${clusters.length > 0 ? `, errors clustered by ${list(clusters)}` : ''}; ` +
    `${count(Math.round(summaries[0].mean_nobs), 'row')}${replicates > 1 ? ` on average, ${count(replicates, 'replicate')}` : ''}` +
    `${pooled && summaries[0].arm !== null && arms.length > 1 ? ', all arms together' : ''}.`;
  const terms = [...new Set(summaries.flatMap((summary) => summary.terms.map((term) => term.term)))];
  const shown = terms.filter((term) => term !== CONSTANT);
  const marks = pooled ? [summaries[0].arm ?? ''] : arms;
  const strips = shown.map((term): CoefficientStrip => {
    return {
      term: termWords(term),
      rows: summaries.flatMap((summary) => {
        const found = summary.terms.find((each) => each.term === term);
        if (found === undefined) return [];
        const arm = summary.arm ?? '';
        const truth = found.truth;
        if (found.replicates > 1 && found.sd !== null) {
          const half = 1.96 * found.sd;
          return [{ arm, estimate: found.mean, low: found.mean - half, high: found.mean + half, truth }];
        }
        const own = regressions.find((r) => r.arm === summary.arm)?.terms.find((each) => each.term === term);
        return [{ arm, estimate: found.mean, low: own?.ci_low ?? NaN, high: own?.ci_high ?? NaN, truth }];
      }),
    };
  });
  const figure =
    strips.length === 0
      ? ''
      : plate(
          coefficientsFigure(
            420,
            strips,
            marks,
            `Coefficients: ${name}`,
            strips
              .map((s) => `${s.term}: ${s.rows.map((r) => `${r.arm} ${num(r.estimate)}`.trim()).join(', ')}`)
              .join('; '),
          ),
          about,
        );
  return (
    `<article class="estimate"><h3>${safe(name)}</h3><div class="beside">${figure}<div>` +
    (replicates > 1 ? summaryTable(name, summaries, pooled) : singleTable(name, regressions, pooled)) +
    said(summaries, regressions) +
    `</div></div></article>`
  );
}

/** A term as a reader says it: `square(log_wealth)` is the square of log wealth. */
export function termWords(term: string): string {
  const square = /^square\((.*)\)$/.exec(term);
  if (square !== null) return `${termWords(square[1])}, squared`;
  return term.replaceAll('_', ' ').replace(/^(\w+)=(.*)$/, '$1: $2');
}

/** Rows in the order of the terms, the constant left out. */
function byTerm<T extends { readonly term: string }>(
  groups: readonly { readonly arm: string; readonly terms: readonly T[] }[],
): { readonly arm: string; readonly term: T }[] {
  const names = [...new Set(groups.flatMap((group) => group.terms.map((term) => term.term)))];
  return names
    .filter((name) => name !== CONSTANT)
    .flatMap((name) =>
      groups.flatMap(({ arm, terms }) => terms.filter((each) => each.term === name).map((term) => ({ arm, term }))),
    );
}

function summaryTable(name: string, summaries: readonly Summary[], pooled: boolean): string {
  const known = summaries.some((summary) => summary.terms.some((term) => term.truth !== null));
  const effects = summaries.some((summary) => (summary.marginal_effects?.length ?? 0) > 0);
  const head = ['term', ...(pooled ? [] : ['arm']), 'mean', 'sd', 's.e.', 'not 0 in'];
  const effectOf = (arm: string, term: string): number | null =>
    summaries.find((summary) => (summary.arm ?? NONE) === arm)?.marginal_effects?.find((effect) => effect.term === term)
      ?.mean ?? null;
  const rows = byTerm(summaries.map(({ arm, terms }) => ({ arm: arm ?? NONE, terms }))).map(({ arm, term }) => [
    termWords(term.term),
    ...(pooled ? [] : [arm]),
    num(term.mean),
    num(term.sd),
    num(term.mean_std_error),
    pct(term.rejects_zero),
    ...(effects ? [num(effectOf(arm, term.term))] : []),
    ...(known ? [pct(term.coverage)] : []),
  ]);
  return table(
    `${name}, over replicates`,
    [...head, ...(effects ? ['effect on chance'] : []), ...(known ? ['truth held in'] : [])],
    rows,
    pooled ? {} : { words: [1] },
  );
}

function singleTable(name: string, regressions: readonly Regression[], pooled: boolean): string {
  const rows = byTerm(regressions.map(({ arm, terms }) => ({ arm: arm ?? NONE, terms }))).map(({ arm, term }) => [
    termWords(term.term),
    ...(pooled ? [] : [arm]),
    num(term.estimate),
    num(term.std_error),
    `${num(term.ci_low)} to ${num(term.ci_high)}`,
    pValue(term.p_value),
  ]);
  return table(
    name,
    ['term', ...(pooled ? [] : ['arm']), 'estimate', 's.e.', '95 % interval', 'p'],
    rows,
    pooled ? {} : { words: [1] },
  );
}

/** What a reader must know before using the numbers. */
function said(summaries: readonly Summary[], regressions: readonly Regression[]): string {
  const lines: string[] = [];
  for (const summary of summaries) {
    const arm = summary.arm === null || summaries.length === 1 ? '' : ` in ‘${summary.arm}’`;
    if (summary.median_F !== null) {
      lines.push(
        `First-stage F${arm}: ${num(summary.median_F)} in the middle replicate, ${num(summary.weakest_F)} at the weakest. ` +
          (summary.median_F < 10
            ? 'The instruments are weak: the estimates lean towards plain least squares and their intervals are not to be trusted.'
            : 'Above 10 the instruments are usually called strong enough.'),
      );
    }
    for (const term of summary.terms) {
      if (term.truth !== null && term.coverage !== null && term.replicates > 1) {
        lines.push(
          `The truth of ${termWords(term.term)} is ${num(term.truth)}; the mean estimate${arm} is ${num(term.mean)}, and ${pct(term.coverage)} of the 95 % intervals hold the truth.`,
        );
      }
      if (
        term.term !== CONSTANT &&
        term.se_ratio !== null &&
        term.replicates >= 10 &&
        (term.se_ratio < 0.8 || term.se_ratio > 1.25)
      ) {
        lines.push(
          `The standard errors of ${termWords(term.term)}${arm} are ${term.se_ratio < 1 ? 'too small' : 'too large'}: ${fixed(term.se_ratio, 2)} of the spread over replicates.`,
        );
      }
    }
    if (summary.failed > 0) lines.push(`${count(summary.failed, 'replicate')}${arm} could not be estimated.`);
  }
  const notes = regressions[0].notes.filter((note) => regressions.every((r) => r.notes.includes(note)));
  return [...lines, ...notes].map((line) => p(line, 'note')).join('');
}
