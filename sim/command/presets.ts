/**
 * The built-in studies: lists them, or writes one out to edit.
 */
import { copyFileSync, existsSync, readdirSync, readFileSync } from 'node:fs';
import { basename, dirname, join, resolve } from 'node:path';
import { fileURLToPath } from 'node:url';
import type { Command } from 'commander';
import { InputError, nearest, type Problem } from '../../network/errors.js';
import { parseStudy } from '../study/parse.js';

/** A built-in study. */
export interface Preset {
  readonly name: string;
  readonly file: string;
  readonly title: string;
  /** The first comment line of the file: what it shows. */
  readonly shows: string;
}

/** Folder of the built-in studies: beside dist/ in the package, at the top of a checkout. */
export const PRESETS = fileURLToPath(new URL('../../../presets', import.meta.url));

/** Every built-in study, the default first. */
export function presets(): Preset[] {
  const names = readdirSync(PRESETS)
    .filter((file) => file.endsWith('.yaml'))
    .map((file) => basename(file, '.yaml'))
    .sort((a, b) => Number(b === DEFAULT) - Number(a === DEFAULT) || a.localeCompare(b, 'en'));
  return names.map((name) => {
    const file = join(PRESETS, `${name}.yaml`);
    const text = readFileSync(file, 'utf8');
    const shows = /^# ?(.*)$/m.exec(text)?.[1] ?? '';
    return { name, file, title: parseStudy(text, file).study.study, shows };
  });
}

const DEFAULT = 'villages-apart';

/** The file of a built-in study. @throws {InputError} when there is none of that name */
export function presetFile(name: string): string {
  const names = presets().map((preset) => preset.name);
  if (names.includes(name)) return join(PRESETS, `${name}.yaml`);
  const guess = nearest(name, names);
  throw new InputError({
    code: 'no-such-preset',
    place: name,
    problem: 'there is no built-in study of this name',
    remedy: guess === undefined ? `use one of ${names.join(', ')}` : `did you mean '${guess}'?`,
  });
}

export function presetsCommand(program: Command): void {
  program
    .command('presets')
    .argument('[name]', 'a built-in study to write out')
    .option('--out <folder>', 'folder to write to', '.')
    .option('--json', 'machine-readable result on standard output')
    .summary('list the built-in studies, or write one out to edit')
    .description('Lists the built-in studies, or writes one out, with the data files it names, to edit.')
    .addHelpText('after', '\nExample:\n  rungsight presets villages-apart\n  rungsight run villages-apart.yaml')
    .action((name: string | undefined, options: { out: string; json?: true }) => {
      if (name === undefined) list(options.json === true);
      else write(name, options.out, options.json === true);
    });
}

function list(json: boolean): void {
  const all = presets();
  if (json) {
    console.log(JSON.stringify({ presets: all.map(({ name, title, shows }) => ({ name, title, shows })) }, null, 2));
    return;
  }
  const width = Math.max(...all.map((preset) => preset.name.length));
  for (const preset of all)
    console.log(`${preset.name.padEnd(width)}  ${preset.title}\n${' '.repeat(width)}  ${preset.shows}\n`);
  console.log('Run one:       npx rungsight run NAME\nTo edit one:   npx rungsight presets NAME');
}

function write(name: string, out: string, json: boolean): void {
  const file = presetFile(name);
  const text = readFileSync(file, 'utf8');
  const { study } = parseStudy(text, file);
  const files = [basename(file), ...namedFiles(study)];
  if (!existsSync(out)) {
    throw new InputError({
      code: 'no-such-folder',
      place: out,
      problem: 'there is no such folder',
      remedy: 'make it first',
    });
  }
  const taken = files.filter((one) => existsSync(join(out, one)));
  if (taken.length > 0) {
    throw new InputError(
      taken.map(
        (one): Problem => ({
          code: 'file-exists',
          place: join(out, one),
          problem: 'this file exists and would be overwritten',
          remedy: 'move it away, or choose another folder with --out',
        }),
      ),
    );
  }
  for (const one of files) copyFileSync(join(dirname(file), one), join(out, one));
  const written = files.map((one) => resolve(out, one));
  if (json) console.log(JSON.stringify({ written }, null, 2));
  else
    console.log(
      `Wrote ${files.map((one) => join(out, one)).join(', ')}.\nNext: npx rungsight run ${join(out, files[0]!)}`,
    );
}

/** Data files a study names, relative to it. */
function namedFiles(study: ReturnType<typeof parseStudy>['study']): string[] {
  const files = new Set<string>();
  if (study.population.households_file !== undefined) files.add(study.population.households_file);
  if (study.population.wealth?.sample !== undefined) files.add(study.population.wealth.sample.file);
  for (const { network } of study.arms) {
    if ('kind' in network && network.kind === 'file') files.add(network.path);
    if ('kind' in network && network.kind === 'configuration' && network.degrees.kind === 'file') {
      files.add(network.degrees.path);
    }
  }
  return [...files];
}
