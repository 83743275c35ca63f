/**
 * `estimate`: regressions on the panel of a results folder, or on a plain table.
 */
import { existsSync, readFileSync, renameSync, statSync, writeFileSync } from 'node:fs';
import { basename, dirname, join } from 'node:path';
import type { Command } from 'commander';
import { InputError } from '../../network/errors.js';
import type { FrameSource } from '../estimate/frame.js';
import { drawsCsv, estimatesCsv, estimatesJson, summaryCsv } from '../estimate/output.js';
import { panelSource } from '../estimate/panel.js';
import { type Estimate, type Plan, parsePlan } from '../estimate/plan.js';
import { planText } from '../estimate/print.js';
import { type PlanResults, runEstimates } from '../estimate/run.js';
import { pythonScript } from '../estimate/script-python.js';
import { rScript } from '../estimate/script-r.js';
import { csvSource, parquetSource } from '../estimate/table.js';
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
      'Runs the regressions of a plan: least squares, logit or instruments, with absorbed effects and robust or\n' +
        'clustered errors, arm by arm and over replicates. In a results folder it writes estimates.csv,\n' +
        'estimates_summary.csv, estimates.json, and panel.R and panel.py that rerun them; on a table it only prints.',
    )
    .addHelpText(
      'after',
      '\nExamples:\n  rungsight estimate results/villages-apart --plan gap.yaml\n' +
        '  rungsight estimate --table survey.csv --plan gap.yaml --json\n\n' +
        'A plan:\n  estimates:\n    - name: Aspiration gap and growth\n      outcome: growth\n' +
        '      covariates: [log_wealth, aspiration_gap, {square: aspiration_gap}]\n' +
        '      effects: [place, generation]\n      cluster: [place]',
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
      const source = folder === undefined ? await tableSource(options.table as string) : await openFolder(folder);
      const results = await runEstimates(plan.estimates, source, plan.place, {
        seed: plan.seed,
        onProgress: progress(options.json === true),
      });
      const head = { source: source.place, plan: options.plan };
      if (folder !== undefined) writeEstimates(folder, plan.estimates, results, head);
      if (options.json) process.stdout.write(estimatesJson(results, head));
      else {
        console.log(planText(results));
        if (folder !== undefined)
          console.log(
            `\nWritten to ${folder}: estimates.csv, estimates_summary.csv, estimates.json; rerun them by panel.R or panel.py.`,
          );
      }
    });
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

async function openFolder(folder: string): Promise<FrameSource> {
  return panelSource(await openResults(folder), folder);
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

/** Writes the tables of a plan's results into its folder, and the scripts that rerun it. */
function writeEstimates(
  folder: string,
  estimates: readonly Estimate[],
  results: PlanResults,
  head: Readonly<Record<string, unknown>>,
): void {
  const draws = drawsCsv(results);
  const files: Record<string, string> = {
    'estimates.csv': estimatesCsv(results),
    'estimates_summary.csv': summaryCsv(results),
    'estimates.json': estimatesJson(results, head),
    'panel.py': pythonScript(estimates),
    'panel.R': rScript(estimates),
    ...(draws === undefined ? {} : { 'estimates_draws.csv': draws }),
  };
  for (const [name, text] of Object.entries(files)) {
    // under another name first, so that a kill leaves no half file
    const path = join(folder, name);
    writeFileSync(`${path}.writing`, text);
    renameSync(`${path}.writing`, path);
  }
}

/** One line of progress on a terminal; nothing elsewhere, the work being short. */
function progress(quiet: boolean): (done: number, total: number, name: string) => void {
  const out = process.stderr;
  if (quiet || !out.isTTY) return () => {};
  return (done, total, name) => {
    out.write(`\r\x1b[K${done < total ? `${done + 1} of ${total}  ${name}` : ''}`);
  };
}
