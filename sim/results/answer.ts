/**
 * The answer: what a run says last, for a person who will not open a table.
 *
 * The question in a sentence; each arm's segregation, frustration, inequality and growth; the paired difference
 * with its interval; the same in plain words. Text only: the report draws its figures from the same cube.
 */
import { replicatesNeeded } from '../measure/contrast.js';
import type { Study } from '../study/complete.js';
import { type ContrastRow, contrastRow } from './contrasts.js';
import type { IndicatorCube } from './cube.js';
import type { PocketSummary } from './pocket-summary.js';

/** One line of the answer table: a label and a cell for each arm. */
export interface AnswerLine {
  readonly label: string;
  readonly cells: readonly string[];
}

/** Everything the answer says, before it is laid out. */
export interface Answer {
  readonly question: string;
  readonly setting: string;
  readonly arms: readonly string[];
  readonly lines: readonly AnswerLine[];
  /** The frustration contrasts named in the words. */
  readonly contrasts: readonly ContrastRow[];
  readonly words: readonly string[];
  readonly cautions: readonly string[];
}

/** Said with every answer, screen and report. */
export const CAUTIONS: readonly string[] = [
  'A simulation explores mechanisms: it predicts no family’s future and is no basis for deciding about one.',
  'Programmes that move people, money or ties need ethics review, consent and the law of the place.',
];

/** Per cent with as many decimals as a reader needs. */
export function percent(x: number): string {
  if (Number.isNaN(x)) return '–';
  const p = 100 * x;
  const text = Math.abs(p) < 10 && p !== 0 ? p.toFixed(1) : p.toFixed(0);
  return `${text.replace('-', Number(text) === 0 ? '' : '−')} %`;
}

/** Percentage points, without sign. */
function points(x: number): string {
  const p = Math.abs(100 * x);
  return p < 10 ? p.toFixed(1) : p.toFixed(0);
}

function decimals(x: number, digits: number): string {
  if (Number.isNaN(x)) return '–';
  const text = x.toFixed(digits);
  // no minus before a number that rounds to nothing
  return Number(text) === 0 ? text.replace('-', '') : text.replace('-', '−');
}

/** Gathers the answer of a finished study. @param lives - of the pockets in each arm, in the order of the arms */
export function answerOf(study: Study, cube: IndicatorCube, lives: readonly PocketSummary[] = []): Answer {
  const last = cube.generations - 1;
  const decided = last - 1;
  const middle = Math.floor(decided / 2);
  const arms = cube.arms;
  const line = (label: string, cell: (arm: number) => string): AnswerLine => ({
    label,
    cells: arms.map((_, a) => cell(a)),
  });
  const lines: AnswerLine[] = [];
  const add = (name: string, label: string, generation: number, form: (x: number) => string): void => {
    if (!cube.has(name)) return;
    const means = arms.map((_, a) => cube.mean(name, a, generation));
    if (means.every(Number.isNaN)) return;
    lines.push(line(label, (a) => form(means[a]!)));
  };
  add('assortativity_place', 'segregation by place (assortativity)', 0, (x) => decimals(x, 2));
  add('assortativity_group', 'segregation by group (assortativity)', 0, (x) => decimals(x, 2));
  add('assortativity_rank', 'segregation by wealth rank (assortativity)', 0, (x) => decimals(x, 2));
  add('economic_connectedness', 'economic connectedness (1 = mixed)', 0, (x) => decimals(x, 2));
  for (const t of new Set([0, middle, decided])) add('share_frustrated', `frustrated, generation ${t}`, t, percent);
  for (const t of new Set([0, last])) add('gini', `Gini of wealth, generation ${t}`, t, (x) => decimals(x, 2));
  lines.push(
    line('growth of mean wealth, a generation', (a) => {
      const growth = meanGrowth(cube, a);
      return `${percent(growth - 1)} (${percent(growth ** (1 / study.years_per_generation) - 1)} a year)`;
    }),
  );
  const peak = peakOfPockets(cube);
  if (peak !== null) {
    add('significant_pockets', `pockets beyond chance, generation ${peak}`, peak, (x) => decimals(x, 1));
    add('pocket_share', `households in pockets, generation ${peak}`, peak, percent);
  }

  const contrasts: ContrastRow[] = [];
  const words: string[] = [];
  for (let b = 0; b < arms.length; b++) {
    for (let a = b + 1; a < arms.length; a++) {
      const rows: ContrastRow[] = [];
      for (let t = 0; t <= decided; t++) {
        const row = contrastRow(cube, a, b, 'share_frustrated', t);
        if (row !== null) rows.push(row);
      }
      const sentence = frustrationSentence(rows, arms.length === 2);
      words.push(...sentence.words);
      contrasts.push(...sentence.named);
    }
  }
  if (arms.length === 1) words.push(levelSentence(cube, decided));
  for (const [a, life] of lives.entries()) words.push(...pocketSentences(life, arms[a]!, cube, a, arms));
  const wanted = contrasts.find((row) => row.replicates > 1);
  if (wanted !== undefined) words.push(precisionSentence(wanted));
  const groups = study.population.places?.count;
  const households = study.population.households;
  return {
    question: question(arms),
    setting:
      `${households === undefined ? 'The households of the file' : `${grouped(households)} households`}` +
      `${groups !== undefined && groups > 1 ? ` in ${groups} places` : ''}, ${study.generations} ${study.generations === 1 ? 'generation' : 'generations'}, ` +
      `${cube.replicates} ${cube.replicates === 1 ? 'replicate' : 'replicates'}` +
      `${arms.length > 1 ? '; every arm has the same households and the same luck' : ''}.`,
    arms,
    lines,
    contrasts,
    words,
    cautions: CAUTIONS,
  };
}

/** Growth factor of mean wealth per generation, from the means over replicates. */
function meanGrowth(cube: IndicatorCube, arm: number): number {
  const last = cube.generations - 1;
  return (cube.mean('mean_wealth', arm, last) / cube.mean('mean_wealth', arm, 0)) ** (1 / last);
}

function question(arms: readonly string[]): string {
  if (arms.length === 1) return `How many households are frustrated in '${arms[0]}', and what becomes of inequality?`;
  if (arms.length === 2) {
    return `Are the same households more or less often frustrated in '${arms[1]}' than in '${arms[0]}'?`;
  }
  return `In which arm are the same households frustrated most often: ${arms.map((arm) => `'${arm}'`).join(', ')}?`;
}

/** Plain words for one pair of arms: the generation that differs most, and the last one. */
function frustrationSentence(
  rows: readonly ContrastRow[],
  onlyPair: boolean,
): { words: string[]; named: ContrastRow[] } {
  if (rows.length === 0) return { words: [], named: [] };
  const { arm, baseline } = rows[0]!;
  const pair = onlyPair ? '' : ` (against '${baseline}')`;
  if (rows[0]!.replicates < 2) {
    const top = largest(rows);
    return {
      words: [
        `In generation ${top.generation} '${arm}' has ${points(top.difference)} points ` +
          `${top.difference >= 0 ? 'more' : 'less'} frustration than '${baseline}'; one replicate cannot say how sure ` +
          'that is: set replicates to 20 or more.',
      ],
      named: [top],
    };
  }
  // looking for the generation that differs most is looking many times (Bonferroni)
  const sure = rows.filter((row) => (row.ci_low > 0 || row.ci_high < 0) && !(row.p_value * rows.length > 0.05));
  const end = rows[rows.length - 1]!;
  if (sure.length === 0) {
    const top = largest(rows);
    return {
      words: [
        `'${arm}' made no difference to frustration${pair} that ${rows[0]!.replicates} replicates can tell from none: ` +
          `the largest, in generation ${top.generation}, is ${signedPoints(top)} points (${interval(top)}).`,
      ],
      named: [top],
    };
  }
  const top = largest(sure);
  const words = [
    `'${arm}' ${verb(top)} frustration by ${points(top.difference)} points (${interval(top)}) in generation ${top.generation}${pair}.`,
  ];
  const other = largest(sure.filter((row) => row.difference > 0 !== top.difference > 0));
  if (other !== undefined && Math.abs(other.difference) > Math.abs(top.difference) / 10) {
    words.push(
      `In generation ${other.generation} it ${verb(other)} it by ${points(other.difference)} points (${interval(other)}).`,
    );
  }
  const named = other === undefined ? [top] : [top, other];
  if (!named.includes(end)) {
    words.push(
      end.ci_low > 0 || end.ci_high < 0
        ? `In the last generation, ${end.generation}, the difference is ${signedPoints(end)} points (${interval(end)}).`
        : `By the last generation, ${end.generation}, no difference is left that can be told from none: ${signedPoints(end)} points (${interval(end)}).`,
    );
    named.push(end);
  }
  return { words, named };
}

function largest(rows: readonly ContrastRow[]): ContrastRow {
  return rows.reduce(
    (best, row) => (best === undefined || Math.abs(row.difference) > Math.abs(best.difference) ? row : best),
    rows[0],
  ) as ContrastRow;
}

function verb(row: ContrastRow): string {
  return row.difference > 0 ? 'raised' : 'lowered';
}

function signedPoints(row: ContrastRow): string {
  return `${row.difference < 0 ? '−' : '+'}${points(row.difference)}`;
}

/** The 95 % interval in points, in the direction of the difference. */
function interval(row: ContrastRow): string {
  const flip = row.difference < 0 && row.ci_high < 0;
  const [low, high] = flip ? [-row.ci_high, -row.ci_low] : [row.ci_low, row.ci_high];
  const end = (x: number): string => `${x < 0 ? '−' : ''}${points(x)}`;
  return `95 % interval ${end(low)} to ${end(high)}`;
}

/** The generation with most pockets beyond chance, over all arms; null when there is none. */
function peakOfPockets(cube: IndicatorCube): number | null {
  let best: number | null = null;
  let most = 0;
  for (let generation = 0; generation < cube.generations; generation++) {
    for (let a = 0; a < cube.arms.length; a++) {
      const mean = cube.mean('significant_pockets', a, generation);
      if (mean > most) {
        most = mean;
        best = generation;
      }
    }
  }
  return best;
}

/** Where pockets arose in one arm, how large they were, how long they lasted, why, and what became of members. */
function pocketSentences(
  life: PocketSummary,
  arm: string,
  cube: IndicatorCube,
  a: number,
  arms: readonly string[],
): string[] {
  if (life.pockets === 0) return [`'${arm}' has no pocket of frustration in any replicate.`];
  if (!life.tested) {
    return [
      `'${arm}' has ${life.pockets} pockets over all replicates; whether they are more than chance was not tested ` +
        '(pockets.permutations is 0).',
    ];
  }
  if (life.significant === 0) {
    return [
      `'${arm}' has ${life.pockets} pockets over all replicates, none larger than chance would make (every p above 0.05).`,
    ];
  }
  const words = [
    `'${arm}' has ${decimals(life.significantPerReplicate, 1)} pockets beyond chance a replicate, the first in generation ` +
      `${life.firstGeneration}, most in generation ${life.peakGeneration}: ${whole(life.medianSize)} core households in the ` +
      `middle case, ${life.medianPlaces === 1 ? 'within one place' : `over ${whole(life.medianPlaces)} places`}, lasting ` +
      `${decimals(life.meanLife, 1)} ${life.meanLife === 1 ? 'generation' : 'generations'} on average.`,
  ];
  const persistence = overAll(cube, 'pocket_persistence', a);
  const others = overAll(cube, 'frustration_persistence', a);
  const elsewhere = overAll(cube, 'pocket_satisfied_elsewhere', a);
  words.push(
    `Of their core members ${percent(life.localShare)} would meet a milestone if they looked at everyone alike (a local cause)` +
      `${Number.isNaN(persistence) ? '' : `; ${percent(persistence)} are still frustrated a generation later (${percent(others)} of all the frustrated)`}` +
      `${Number.isNaN(elsewhere) ? '' : `; ${percent(elsewhere)} are satisfied at the same time in '${arms[a === 0 ? 1 : 0]}'`}.`,
  );
  return words;
}

/** Mean over generations and replicates that have a value. */
function overAll(cube: IndicatorCube, name: string, arm: number): number {
  let sum = 0;
  let count = 0;
  for (let generation = 0; generation < cube.generations; generation++) {
    for (const x of cube.over(name, arm, generation)) {
      if (Number.isNaN(x)) continue;
      sum += x;
      count++;
    }
  }
  return count > 0 ? sum / count : NaN;
}

function whole(x: number): string {
  return String(Math.round(x));
}

/** How many replicates a tighter interval would take. */
function precisionSentence(row: ContrastRow): string {
  const half = (row.ci_high - row.ci_low) / 2;
  const target = half > 0.01 ? 0.01 : half / 2;
  const needed = replicatesNeeded({ mcSe: row.mc_se, replicates: row.replicates }, target);
  return (
    `The difference in generation ${row.generation} has a Monte Carlo standard error of ${(100 * row.mc_se).toFixed(2)} points; ` +
    `an interval of ±${(100 * target).toFixed(target < 0.01 ? 2 : 0)} ${target === 0.01 ? 'point' : 'points'} would take about ${grouped(needed)} replicates.`
  );
}

function levelSentence(cube: IndicatorCube, decided: number): string {
  const shares = Array.from({ length: decided + 1 }, (_, t) => cube.mean('share_frustrated', 0, t));
  const top = shares.indexOf(Math.max(...shares));
  return (
    `Frustration is ${percent(shares[0]!)} at the start, highest in generation ${top} (${percent(shares[top]!)}) ` +
    `and ${percent(shares[decided]!)} in the last generation, ${decided}.`
  );
}

function grouped(n: number): string {
  return String(n).replace(/\B(?=(\d{3})+$)/g, ',');
}

/** Lays the answer out for a terminal. */
export function answerText(answer: Answer): string {
  const head = ['', ...answer.arms];
  const table = [head, ...answer.lines.map((line) => [line.label, ...line.cells])];
  const widths = head.map((_, c) => Math.max(...table.map((row) => row[c]!.length)));
  const rows = table.map((row) =>
    row
      .map((cell, c) => (c === 0 ? cell.padEnd(widths[c]!) : cell.padStart(widths[c]!)))
      .join('   ')
      .trimEnd(),
  );
  return [
    answer.question,
    answer.setting,
    '',
    ...rows,
    '',
    ...answer.words.flatMap((sentence) => wrap(sentence)),
    '',
    ...answer.cautions.flatMap((sentence) => wrap(sentence)),
  ].join('\n');
}

/** Breaks a sentence at spaces so that lines stay within 96 characters. */
function wrap(sentence: string): string[] {
  const lines: string[] = [];
  let line = '';
  for (const word of sentence.split(' ')) {
    if (line !== '' && line.length + 1 + word.length > 96) {
      lines.push(line);
      line = word;
    } else {
      line = line === '' ? word : `${line} ${word}`;
    }
  }
  return [...lines, line];
}
