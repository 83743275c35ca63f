#!/usr/bin/env node
/**
 * The command line: names the commands, turns what goes wrong into a sentence and an exit status.
 *
 * Exit status 0 done, 1 the work failed, 2 the request was wrong (usage, study file, data). The commands are one
 * file each; this is the only place that ends the process.
 */
import { Command, CommanderError } from 'commander';
import { describe, InputError, RunError } from '../../network/errors.js';
import { VERSION } from '../version.js';
import { checkCommand } from './check.js';
import { estimateCommand } from './estimate.js';
import { networkCommand } from './network.js';
import { presetsCommand } from './presets.js';
import { reportCommand } from './report.js';
import { runCommand } from './run.js';
import { viewCommand } from './view.js';

const program = new Command('rungsight')
  .description(
    'Compares segregated and mixed social networks on the same households and the same luck:\n' +
      'who is frustrated, where pockets of frustration form, and how sure that is.',
  )
  .version(VERSION, '--version', 'print the version')
  .helpOption('--help', 'show help')
  .configureHelp({ showGlobalOptions: false })
  .configureOutput({ outputError: (text, write) => write(`${usageProblem(text)}\n`) })
  .exitOverride();

for (const register of [
  runCommand,
  checkCommand,
  presetsCommand,
  viewCommand,
  reportCommand,
  estimateCommand,
  networkCommand,
]) {
  register(program);
}
for (const command of program.commands) leaveExitsToMain(command);

try {
  await program.parseAsync();
} catch (error) {
  process.exitCode = report(error);
}

function leaveExitsToMain(command: Command): void {
  command.exitOverride().helpOption('--help', 'show help').copyInheritedSettings(program);
  for (const inner of command.commands) leaveExitsToMain(inner);
}

/** A usage error of the parser in the form of ours: `where: what is wrong; what to do`. */
function usageProblem(text: string): string {
  const [first, second] = text.trim().split('\n');
  const words = process.argv.slice(2).filter((word) => !word.startsWith('-'));
  const command = program.commands.find((one) => one.name() === words[0])?.name();
  const where = command === undefined ? 'rungsight' : `rungsight ${command}`;
  const guess = /\(Did you mean (.*)\?\)/.exec(second ?? '')?.[1];
  const remedy = guess === undefined ? `see '${where} --help'` : `did you mean ${guess}? ('${where} --help')`;
  return `${where}: ${(first ?? '').replace(/^error: /, '')}; ${remedy}`;
}

/** Says what went wrong on standard error and gives the exit status. */
function report(error: unknown): number {
  const json = process.argv.includes('--json');
  if (error instanceof CommanderError) {
    // help and version end here too, with status 0
    return error.exitCode === 0 ? 0 : 2;
  }
  if (error instanceof InputError) {
    if (json) console.log(JSON.stringify({ errors: error.problems }, null, 2));
    for (const problem of error.problems) console.error(describe(problem));
    return 2;
  }
  if (error instanceof RunError) {
    if (json) console.log(JSON.stringify({ errors: [{ problem: error.message }] }, null, 2));
    console.error(error.message);
    return 1;
  }
  console.error('rungsight: this is a fault of the program, not of your study; please report it with what follows');
  console.error(error instanceof Error ? (error.stack ?? error.message) : String(error));
  return 1;
}
