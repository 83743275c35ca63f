/**
 * What was read from a file dropped on the sheet, in words and numbers, or what is wrong with it.
 *
 * Reads with the same functions a run uses (sim/study/inputs.ts, network/exchange), so what is accepted here runs.
 * Pure: text in, facts out.
 */
import { InputError, type Problem } from '../../network/errors.js';
import { readCsv } from '../../network/exchange/csv.js';
import { readTies } from '../../network/exchange/read-ties.js';
import type { Study } from '../../sim/study/complete.js';
import { type HouseholdsFile, readDegrees, readHouseholds, readSample } from '../../sim/study/inputs.js';
import { amount, plural } from '../screen/words.js';

export type Role = 'households' | 'ties' | 'degrees' | 'survey' | 'study' | 'unknown';

/** One thing that was found in a file. */
export interface Fact {
  readonly label: string;
  readonly says: string;
}

export interface Reading {
  readonly name: string;
  readonly role: Role;
  /** The study names this file. */
  readonly used: boolean;
  readonly facts: readonly Fact[];
  readonly problems: readonly Problem[];
}

/** How a study uses a file, by its path; null when it does not. */
export function roleIn(study: Study | null, name: string): Exclude<Role, 'study' | 'unknown'> | null {
  if (study === null) return null;
  if (study.population.households_file === name) return 'households';
  if (study.population.wealth?.sample?.file === name) return 'survey';
  for (const { network } of study.arms) {
    if (!('kind' in network)) continue;
    if (network.kind === 'file' && network.path === name) return 'ties';
    if (network.kind === 'configuration' && network.degrees.kind === 'file' && network.degrees.path === name) {
      return 'degrees';
    }
  }
  return null;
}

/** What a file looks like, from its name and first line. */
export function roleLooks(name: string, text: string): Role {
  if (/\.ya?ml$/i.test(name)) return 'study';
  if (/\.graphml$/i.test(name)) return 'ties';
  if (!/\.csv$/i.test(name)) return 'unknown';
  const header = (text.split(/\r?\n/, 1)[0] ?? '')
    .split(',')
    .map((cell) => cell.trim().replaceAll('"', '').toLowerCase());
  if (header.includes('source') && header.includes('target')) return 'ties';
  if (header.includes('household') && header.includes('wealth')) return 'households';
  return 'survey';
}

/**
 * Reads a file as the study uses it, or as what it looks like.
 *
 * @param study - the study as far as it holds, or null
 * @param texts - other files at hand, by name: ties are read against the households file
 */
export function readingOf(
  name: string,
  text: string,
  study: Study | null,
  texts: ReadonlyMap<string, string> = new Map(),
): Reading {
  const inStudy = roleIn(study, name);
  const role = inStudy ?? roleLooks(name, text);
  const used = inStudy !== null;
  try {
    return { name, role, used, facts: factsOf(role, name, text, study, texts), problems: [] };
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    return { name, role, used, facts: [], problems: error.problems };
  }
}

function factsOf(
  role: Role,
  name: string,
  text: string,
  study: Study | null,
  texts: ReadonlyMap<string, string>,
): Fact[] {
  switch (role) {
    case 'households':
      return householdFacts(readHouseholds(text, name));
    case 'ties':
      return tieFacts(name, text, study, texts);
    case 'survey':
      return surveyFacts(name, text, study);
    case 'degrees':
      return degreeFacts(name, text, study, texts);
    default:
      if (role === 'study') return [];
      throw new InputError({
        code: 'unknown-file',
        place: name,
        problem: 'this is neither a study (.yaml), nor a table (.csv), nor a graph (.graphml)',
        remedy: 'save it as one of these',
      });
  }
}

/** Least, middle and largest of some numbers in words. */
function range(values: ArrayLike<number>): string {
  const sorted = Float64Array.from(values)
    .filter((v) => !Number.isNaN(v))
    .sort();
  if (sorted.length === 0) return 'empty';
  const [low, middle, high] = [sorted[0], sorted[Math.floor((sorted.length - 1) / 2)], sorted[sorted.length - 1]];
  return low === high ? `${amount(low)} throughout` : `${amount(low)} to ${amount(high)}, median ${amount(middle)}`;
}

function names(list: readonly string[], most = 6): string {
  return list.length <= most ? list.join(', ') : `${list.slice(0, most).join(', ')} …`;
}

function householdFacts(file: HouseholdsFile): Fact[] {
  const facts: Fact[] = [
    { label: 'households', says: plural(file.n, 'row') },
    { label: 'wealth', says: range(file.wealth) },
    {
      label: 'places',
      says: file.placeNames.length === 1 ? 'one' : `${file.placeNames.length} (${names(file.placeNames)})`,
    },
    { label: 'groups', says: groupsIn(file) },
  ];
  for (const { name, values } of file.covariates) {
    if (values instanceof Float64Array) {
      const missing = values.filter((v) => Number.isNaN(v)).length;
      facts.push({ label: name, says: `${range(values)}${missing > 0 ? `; ${plural(missing, 'row')} empty` : ''}` });
    } else {
      const seen = [...new Set(values.filter((v) => v !== null))];
      facts.push({ label: name, says: `text: ${names(seen)}` });
    }
  }
  return facts;
}

function groupsIn(file: HouseholdsFile): string {
  if (file.groupNames.length === 1) return 'one';
  const counts = new Array<number>(file.groupNames.length).fill(0);
  for (const code of file.group) counts[code]!++;
  return file.groupNames.map((name, g) => `${name} ${counts[g]}`).join(', ');
}

function tieFacts(name: string, text: string, study: Study | null, texts: ReadonlyMap<string, string>): Fact[] {
  const file = study?.population.households_file;
  const people = file === undefined ? undefined : texts.get(file);
  const ids = people === undefined || file === undefined ? null : readHouseholds(people, file).ids;
  const n = study?.population.households;
  if (ids === null && n === undefined) return looseTies(name, text);
  const ties = readTies(text, name, ids ?? n!);
  const degree = Float64Array.from({ length: ties.n }, (_, i) => ties.start[i + 1] - ties.start[i]);
  let isolates = 0;
  for (let i = 0; i < ties.n; i++) if (degree[i] === 0) isolates++;
  return [
    { label: 'ties', says: `${plural(ties.target.length / 2, 'tie')} between ${plural(ties.n, 'household')}` },
    { label: 'ties each', says: `${range(degree)}, mean ${amount(ties.target.length / ties.n)}` },
    { label: 'without ties', says: isolates === 0 ? 'none' : plural(isolates, 'household') },
    { label: 'weights', says: ties.weight === null ? 'none' : range(ties.weight) },
  ];
}

/** A tie list with no study to say who the households are. */
function looseTies(name: string, text: string): Fact[] {
  if (/\.graphml$/i.test(name)) return [{ label: 'graph', says: 'read when the study names its households' }];
  const table = readCsv(text, name);
  return [
    { label: 'rows', says: plural(table.rows.length, 'tie') },
    { label: 'columns', says: table.header.join(', ') },
  ];
}

function surveyFacts(name: string, text: string, study: Study | null): Fact[] {
  const table = readCsv(text, name);
  const facts: Fact[] = [
    { label: 'rows', says: plural(table.rows.length, 'row') },
    { label: 'columns', says: table.header.join(', ') },
  ];
  const sample = study?.population.wealth?.sample;
  if (sample?.file === name) {
    facts.push({ label: sample.column, says: range(readSample(text, name, sample.column, sample.weight).values) });
  }
  return facts;
}

function degreeFacts(name: string, text: string, study: Study | null, texts: ReadonlyMap<string, string>): Fact[] {
  const file = study?.population.households_file;
  const people = file === undefined ? undefined : texts.get(file);
  const n = people === undefined || file === undefined ? study?.population.households : readHouseholds(people, file).n;
  for (const { network } of study?.arms ?? []) {
    if (!('kind' in network) || network.kind !== 'configuration' || network.degrees.kind !== 'file') continue;
    if (network.degrees.path === name && n !== undefined) {
      return [{ label: 'ties each', says: range(readDegrees(text, name, network.degrees.column, n)) }];
    }
  }
  return [];
}

/** What a role is called. */
export const ROLE_WORDS: Readonly<Record<Role, string>> = {
  households: 'households',
  ties: 'ties',
  degrees: 'numbers of ties',
  survey: 'survey',
  study: 'study',
  unknown: 'not read',
};
