/**
 * Reads a study and the files it names from disk.
 */
import { existsSync, readFileSync, statSync } from 'node:fs';
import { basename, dirname, relative, resolve } from 'node:path';
import { InputError, nearest, type Problem } from '../../network/errors.js';
import { checkStudyEstimates } from '../estimate/of-study.js';
import { loadInputs } from '../study/inputs.js';
import { type ParsedStudy, parseStudy } from '../study/parse.js';
import type { Path } from '../study/problems.js';
import type { Prepared } from '../study/replicate.js';
import { presetFile, presets } from './presets.js';

export interface StudyOnDisk {
  /** The study file. */
  readonly file: string;
  readonly parsed: ParsedStudy;
  readonly prepared: Prepared;
}

/** Reads a study file, or a built-in study by name. @throws {InputError} with every problem found */
export async function readStudy(given: string): Promise<StudyOnDisk> {
  const file = studyFile(given);
  const parsed = parseStudy(readText(file, shownPath(file)), shownPath(file));
  const folder = dirname(file);
  const inputs = await loadInputs(parsed, async (path) => {
    const full = resolve(folder, path);
    return existsSync(full) && statSync(full).isFile() ? readText(full, path) : null;
  });
  const prepared: Prepared = { study: parsed.study, inputs };
  await checkStudyEstimates(prepared, parsed.place);
  return { file, parsed, prepared };
}

/** The path of a study: a file, or a built-in study by name. @throws {InputError} when it is neither */
export function studyFile(given: string): string {
  const stat = statSync(given, { throwIfNoEntry: false });
  if (stat?.isFile()) return given;
  if (stat?.isDirectory()) {
    throw new InputError({
      code: 'not-a-study',
      place: given,
      problem: 'this is a folder, not a study file',
      remedy: existsSync(resolve(given, 'study.yaml'))
        ? `give ${given}/study.yaml, or look at its results with 'rungsight view ${given}'`
        : 'give the path of a .yaml file',
    });
  }
  const names = presets().map((preset) => preset.name);
  if (names.includes(given)) return presetFile(given);
  const guess = nearest(basename(given).replace(/\.ya?ml$/, ''), names);
  throw new InputError({
    code: 'no-such-file',
    place: given,
    problem: 'there is no such study file',
    remedy:
      guess === undefined
        ? `give the path of a .yaml file, or a built-in study (${names.join(', ')})`
        : `did you mean the built-in study '${guess}'?`,
  });
}

/** How a path is shown in errors: short when it lies below the working folder. */
function shownPath(file: string): string {
  const short = relative(process.cwd(), resolve(file));
  return short.startsWith('..') ? file : short;
}

/** Why a file could not be read, in words. */
function reasonOf(error: unknown): string {
  switch ((error as NodeJS.ErrnoException).code) {
    case 'ENOENT':
      return 'there is no such file';
    case 'EISDIR':
      return 'this is a folder';
    case 'EACCES':
    case 'EPERM':
      return 'you may not read this file';
    default:
      return `the file cannot be read (${(error as Error).message})`;
  }
}

/** A text file as UTF-8. @throws {InputError} when it cannot be read or is no text */
export function readText(file: string, shown: string): string {
  let bytes: Buffer;
  try {
    bytes = readFileSync(file);
  } catch (error) {
    throw new InputError({
      code: 'cannot-read',
      place: shown,
      problem: reasonOf(error),
      remedy: 'check the path, and that you may read the file',
    });
  }
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch {
    throw new InputError({
      code: 'not-utf8',
      place: shown,
      problem: 'this is not UTF-8 text',
      remedy: 'save it as UTF-8 (in a spreadsheet: "CSV UTF-8")',
    });
  }
}

/** Gives problems that name a part of the study (`arms[1].network.mixing.value`) their line and column. */
export function placed(problems: readonly Problem[], parsed: ParsedStudy): Problem[] {
  return problems.map((problem) =>
    /^arms\[\d+\]/.test(problem.place) ? { ...problem, place: parsed.place(pathOf(problem.place)) } : problem,
  );
}

function pathOf(text: string): Path {
  return text
    .split(/\.|\[|\]/)
    .filter((step) => step !== '')
    .map((step) => (/^\d+$/.test(step) ? Number(step) : step));
}
