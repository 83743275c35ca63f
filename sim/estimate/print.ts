/**
 * Results of regressions for a person to read: a table of coefficients, then what is behind it in plain words.
 */
import type { Coefficient, FTest } from './fit.js';
import type { EstimateResult, PlanResults } from './run.js';
import type { EstimateSummary } from './summary.js';

const METHOD_WORDS = { ols: 'least squares', logit: 'logit', iv: 'two-stage least squares' } as const;

/** The whole answer: one table an estimate and arm, over replicates where there are several. */
export function planText(results: PlanResults): string {
  const parts = results.summary.map((summary) => {
    const own = results.estimates.filter((r) => r.name === summary.name && r.arm === summary.arm);
    return own.length === 1 ? resultText(own[0]) : summaryText(summary, own);
  });
  return parts.join('\n\n');
}

/** One regression. */
export function resultText(result: EstimateResult): string {
  const errors =
    result.errors === 'clustered'
      ? `errors clustered by ${Object.entries(result.clusters_by)
          .map(([name, count]) => `${name} (${whole(count)})`)
          .join(' and ')}`
      : { classical: 'classical errors', robust: 'robust errors (HC1)', 'robust-hc3': 'robust errors (HC3)' }[
          result.errors
        ];
  const absorbed = Object.entries(result.absorbed).map(([name, count]) => `${name} (${whole(count)})`);
  const lines = [
    heading(result.name, result.arm),
    `${result.outcome}, ${METHOD_WORDS[result.method]}, ${errors}${absorbed.length ? `, effects of ${absorbed.join(', ')} absorbed` : ''}`,
    '',
    ...coefficientTable(result.terms, result.level),
  ];
  if (result.marginal_effects?.length) {
    lines.push(
      '',
      'Average marginal effects on the probability',
      ...coefficientTable(result.marginal_effects, result.level),
    );
  }
  lines.push('', rowsLine(result), ...diagnosticLines(result), ...result.notes);
  for (const { term, why } of result.dropped) lines.push(`Dropped: ${term} ${why}.`);
  return lines.join('\n');
}

function summaryText(summary: EstimateSummary, results: readonly EstimateResult[]): string {
  const known = summary.terms.some((term) => term.truth !== null);
  const rows = summary.terms.map((term) => [
    term.term,
    figure(term.mean),
    figure(term.sd),
    figure(term.mean_std_error),
    figure(term.se_ratio),
    share(term.rejects_zero),
    ...(known ? [figure(term.truth), figure(term.bias), share(term.coverage)] : []),
  ]);
  const header = [
    'term',
    'mean',
    'sd',
    'mean s.e.',
    's.e./sd',
    'rejects 0',
    ...(known ? ['truth', 'bias', 'covers truth'] : []),
  ];
  const lines = [
    heading(summary.name, summary.arm),
    `${summary.outcome}, ${METHOD_WORDS[summary.method]}, over ${summary.replicates} replicates of ${whole(Math.round(summary.mean_nobs))} rows on average`,
    '',
    ...grid([header, ...rows]),
    '',
  ];
  for (const term of summary.terms) {
    if (term.se_ratio !== null && term.replicates >= 10 && (term.se_ratio < 0.8 || term.se_ratio > 1.25)) {
      lines.push(
        `The standard errors of ${term.term} are ${term.se_ratio < 1 ? 'too small' : 'too large'}: on average ${figure(term.se_ratio)} of the spread over replicates.`,
      );
    }
    if (term.anderson_rubin_coverage !== null) {
      lines.push(
        `The Anderson–Rubin set of ${term.term} holds the truth in ${share(term.anderson_rubin_coverage)} of replicates.`,
      );
    }
  }
  if (summary.median_F !== null && summary.weakest_F !== null) {
    lines.push(
      `First-stage F: ${figure(summary.median_F)} in the middle, ${figure(summary.weakest_F)} at the weakest.${summary.median_F < 10 ? ' Weak instruments: below 10 the estimates lean towards OLS and their standard errors are not to be trusted.' : ''}`,
    );
  }
  if (summary.failed > 0)
    lines.push(
      `${summary.failed} replicate${summary.failed > 1 ? 's' : ''} could not be estimated and ${summary.failed > 1 ? 'are' : 'is'} left out.`,
    );
  const dropped = new Map(results.flatMap((r) => r.dropped.map((d) => [`${d.term} ${d.why}`, d])));
  for (const text of dropped.keys()) lines.push(`Dropped: ${text}.`);
  // what was said of every replicate alike
  const said = results[0].notes.filter((note) => results.every((result) => result.notes.includes(note)));
  return [...lines, ...said, ...summary.notes].join('\n').trimEnd();
}

function heading(name: string, arm: string | null): string {
  const text = arm === null ? name : `${name}, ${arm.includes(' + ') ? 'arms' : 'arm'} ${arm}`;
  return `${text}\n${'─'.repeat(text.length)}`;
}

function coefficientTable(terms: readonly Coefficient[], level: number): string[] {
  const percent = `${Math.round(level * 1000) / 10} % interval`;
  return grid([
    ['term', 'estimate', 's.e.', 't', 'p', percent],
    ...terms.map((term) => [
      term.term,
      figure(term.estimate),
      figure(term.std_error),
      Number.isFinite(term.statistic) ? term.statistic.toFixed(2).replace('-', '−') : '–',
      probability(term.p_value),
      `${figure(term.ci_low)} to ${figure(term.ci_high)}`,
    ]),
  ]);
}

function rowsLine(result: EstimateResult): string {
  const parts = [`${whole(result.nobs)} rows`];
  if (result.households !== null) parts.push(`${whole(result.households)} households`);
  const fit =
    result.method === 'logit'
      ? `McFadden R² ${figure(result.r_squared)}`
      : `R² ${figure(result.r_squared)}${result.within_r_squared === null ? '' : `, within ${figure(result.within_r_squared)}`}`;
  const lost: string[] = [];
  if (result.rows_missing > 0) {
    const by = Object.entries(result.missing).map(([name, count]) => `${name} in ${whole(count)}`);
    lost.push(`${whole(result.rows_missing)} rows dropped for missing values (${by.join(', ')})`);
  }
  if (result.singletons > 0) lost.push(`${whole(result.singletons)} dropped as the only row of their absorbed group`);
  return `${[...parts, fit].join(', ')}.${lost.length ? ` ${lost.join('; ')}.` : ''}`;
}

function diagnosticLines(result: EstimateResult): string[] {
  if (result.method !== 'iv') return [];
  const d = result.diagnostics;
  const lines: string[] = [];
  for (const [key, test] of Object.entries(d)) {
    if (key.startsWith('first_stage_F'))
      lines.push(`First-stage F${key.slice(13) ? ` (${key.slice(13)})` : ''}: ${fTest(test as FTest)}`);
  }
  if (d.effective_F && result.errors !== 'classical') {
    lines.push(
      `Effective F: ${figure(d.effective_F.F)}, against ${figure(d.effective_F.critical)} to rule out a bias of a tenth`,
    );
  }
  const hausman = d.wu_hausman_robust ?? d.wu_hausman;
  if (hausman)
    lines.push(
      `Wu–Hausman: ${fTest(hausman)}${hausman.p < 0.05 ? ', least squares differs' : ', least squares would do as well'}`,
    );
  const over = d.hansen_j ?? d.sargan;
  if (over) {
    lines.push(
      `${d.hansen_j ? 'Hansen J' : 'Sargan'}: ${figure(over.stat)} on ${over.df} degree${over.df > 1 ? 's' : ''} of freedom, p ${probability(over.p)}${over.p < 0.05 ? ': the instruments disagree' : ''}`,
    );
  }
  if (d.anderson_rubin?.kind === 'interval') lines.push(d.anderson_rubin.words);
  return lines;
}

function fTest(test: FTest): string {
  return `${figure(test.F)} (${test.df1} and ${test.df2}), p ${probability(test.p)}`;
}

/** Lines of aligned cells, the first column to the left, numbers to the right. */
function grid(rows: readonly (readonly string[])[]): string[] {
  const widths = rows[0].map((_, c) => Math.max(...rows.map((row) => row[c].length)));
  return rows.map((row) =>
    row
      .map((cell, c) => (c === 0 ? cell.padEnd(widths[c]) : cell.padStart(widths[c])))
      .join('  ')
      .trimEnd(),
  );
}

/** Four significant digits. */
function figure(x: number | null): string {
  if (x === null || Number.isNaN(x)) return '–';
  if (!Number.isFinite(x)) return x > 0 ? '∞' : '−∞';
  if (x === 0) return '0';
  const size = Math.abs(x);
  const text =
    size >= 1e6 || size < 1e-4 ? x.toExponential(3) : size >= 1e4 ? x.toFixed(0) : String(Number(x.toPrecision(4)));
  return text.replaceAll('-', '−');
}

function probability(p: number): string {
  return Number.isNaN(p) ? '–' : p < 0.001 ? '<0.001' : p.toFixed(3);
}

function share(x: number | null): string {
  return x === null ? '–' : `${Math.round(x * 1000) / 10} %`;
}

function whole(n: number): string {
  return n.toLocaleString('en-GB');
}
