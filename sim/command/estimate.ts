/**
 * `estimate`: regressions on the panel of a results folder, or on a plain table.
 */
import { existsSync, readFileSync, statSync } from 'node:fs';
import { basename, dirname } from 'node:path';
import type { Command } from 'commander';
import { InputError } from '../../network/errors.js';
import type { FrameSource } from '../estimate/frame.js';
import { estimateFiles, estimatesJson } from '../estimate/output.js';
import { panelSource } from '../estimate/panel.js';
import { type Estimate, Estimate as EstimateSchema, type Placer, type Plan, parsePlan } from '../estimate/plan.js';
import { planText } from '../estimate/print.js';
import { type PlanResults, type RunOptions, runEstimates } from '../estimate/run.js';
import { csvSource, parquetSource } from '../estimate/table.js';
import { addFiles } from '../results/folder.js';
import { folderSource, openResults } from '../results/open.js';

interface Options {
  readonly plan: string;
  readonly table?: string;
  readonly json?: true;
}

export function estimateCommand(program: Command): void {
  program
    .command('estimate')
    .argument('[folder]', 'results folder of a run')
    .requiredOption('--plan <file>', 'plan of regressions (YAML)')
    .option('--table <file>', 'a plain CSV or Parquet table instead of a results folder')
    .option('--json', 'machine-readable result on standard output')
    .summary('run regressions on the panel')
    .description(
      'Runs the regressions of a plan: least squares, logit or instruments, with absorbed effects and robust or ' +
        'clustered errors, arm by arm and over replicates. In a results folder it writes estimates.csv, ' +
        'estimates_summary.csv, estimates.json, and panel.R and panel.py that rerun them; on a table it only prints.',
    )
    .addHelpText(
      'after',
      '\nExamples:\n  rungsight estimate results/villages-apart --plan gap.yaml\n' +
        '  rungsight estimate --table survey.csv --plan gap.yaml --json\n\n' +
        'A plan:\n  estimates:\n    - name: Aspiration gap and growth\n      outcome: growth\n' +
        '      covariates: [log_wealth, aspiration_gap, {square: aspiration_gap}]\n' +
        '      effects: [place, generation]\n      cluster: [place]\n\n' +
        `Keys of an estimate:\n${keys()}`,
    )
    .action(async (folder: string | undefined, options: Options) => {
      const plan = readPlan(options.plan);
      if ((folder === undefined) === (options.table === undefined)) {
        throw new InputError({
          code: 'usage',
          place: 'estimate',
          problem: folder === undefined ? 'there is nothing to estimate from' : 'a folder and a table are both given',
          remedy: 'name a results folder, or a table by --table',
        });
      }
      const running = { seed: plan.seed, onProgress: progress(options.json === true), plan: options.plan };
      const results =
        folder === undefined
          ? await runEstimates(plan.estimates, await tableSource(options.table as string), plan.place, running)
          : await estimateFolder(folder, plan.estimates, plan.place, running);
      if (options.json) {
        process.stdout.write(estimatesJson(results, { source: folder ?? options.table, plan: options.plan }));
        return;
      }
      console.log(planText(results));
      if (folder !== undefined) {
        console.log(
          `\nWritten to ${folder}: estimates.csv, estimates_summary.csv, estimates.json; rerun them by panel.R or panel.py.`,
        );
      }
    });
}

/** The keys of an estimate with their sentences, from the schema. */
function keys(): string {
  const names = Object.keys(EstimateSchema.shape) as (keyof typeof EstimateSchema.shape)[];
  const width = Math.max(...names.map((name) => name.length));
  return names.map((name) => `  ${name.padEnd(width)}  ${EstimateSchema.shape[name].description ?? ''}`).join('\n');
}

function readPlan(file: string): Plan {
  if (!existsSync(file) || !statSync(file).isFile()) {
    throw new InputError({
      code: 'no-such-file',
      place: file,
      problem: 'there is no such plan',
      remedy: 'check the path',
    });
  }
  return parsePlan(readFileSync(file, 'utf8'), file);
}

/** A table file: Parquet by its ending or its first bytes, else CSV. */
export async function tableSource(file: string): Promise<FrameSource> {
  const buffer = await folderSource(dirname(file)).open(basename(file));
  if (buffer === null) {
    throw new InputError({
      code: 'no-such-file',
      place: file,
      problem: 'there is no such table',
      remedy: 'check the path',
    });
  }
  const start = new TextDecoder().decode(await buffer.slice(0, 4));
  if (start === 'PAR1' || file.endsWith('.parquet')) return parquetSource(buffer, file);
  return csvSource(readFileSync(file, 'utf8'), file);
}

/**
 * Runs estimates on a results folder and writes their files into it. A study with `estimates:` ends with this.
 *
 * @param place - gives `file:line:column` of a part of the plan or study
 * @throws {InputError} as runEstimates and openResults
 */
export async function estimateFolder(
  folder: string,
  estimates: readonly Estimate[],
  place: Placer,
  options: RunOptions & { readonly plan?: string } = {},
): Promise<PlanResults> {
  const source = await panelSource(await openResults(folder), folder);
  const results = await runEstimates(estimates, source, place, options);
  const head = { source: folder, ...(options.plan === undefined ? {} : { plan: options.plan }) };
  addFiles(folder, estimateFiles(estimates, results, head));
  return results;
}

/** One line of progress on a terminal; nothing elsewhere, the work being short. */
function progress(quiet: boolean): (done: number, total: number, name: string) => void {
  const out = process.stderr;
  if (quiet || !out.isTTY) return () => {};
  return (done, total, name) => {
    out.write(`\r\x1b[K${done < total ? `${done + 1} of ${total}  ${name}` : ''}`);
  };
}
