/**
 * The first choice of the household question: are households drawn, or read from a file?
 *
 * Two ways that exclude each other in the study file; turning one into the other takes the settings of the first
 * out and starts those of the second.
 */
import { normalCdf } from '../../sim/random/normal.js';
import { sdLogOfGini } from '../../sim/study/population.js';
import { type KeyOrder, type Path, removeValue, setValue, type Value, valueAt } from './edit.js';
import { starter } from './words.js';

export type Origin = 'drawn' | 'file';

export function originOf(raw: unknown): Origin {
  return valueAt(raw, ['population', 'households_file']) === undefined ? 'drawn' : 'file';
}

/** The text with households from the other origin. @param file - a households file at hand, or its usual name */
export function turnOrigin(text: string, raw: unknown, to: Origin, file: string, order: KeyOrder): string {
  let out = text;
  const drop = (path: Path): void => {
    if (valueAt(raw, path) !== undefined) out = removeValue(out, path);
  };
  if (to === 'file') {
    out = setValue(out, ['population', 'households_file'], file, order);
    for (const key of ['households', 'places', 'wealth']) drop(['population', key]);
    const groups = valueAt(raw, ['population', 'groups']);
    // who is in a group is said by the file; only groups with preferences of their own stay
    if (Array.isArray(groups)) {
      for (let g = groups.length - 1; g >= 0; g--) {
        if (valueAt(groups, [g, 'preferences']) === undefined) {
          out = removeValue(out, groups.length === 1 ? ['population', 'groups'] : ['population', 'groups', g]);
          continue;
        }
        for (const key of ['share', 'relative_wealth']) drop(['population', 'groups', g, key]);
      }
      if (Array.isArray(groups) && groups.every((group) => valueAt(group, ['preferences']) === undefined)) {
        out = emptied(out);
      }
    }
    return out;
  }
  for (const key of ['households', 'wealth'] as const) {
    if (valueAt(raw, ['population', key]) === undefined) {
      out = setValue(out, ['population', key], starter(key) as Value, order);
    }
  }
  return removeValue(out, ['population', 'households_file']);
}

/** An empty list of groups says nothing and is refused: it goes. */
function emptied(text: string): string {
  return /^\s*groups:\s*\[\]/m.test(text) ? removeValue(text, ['population', 'groups']) : text;
}

function rounded(value: number): number {
  return Number(value.toPrecision(3));
}

/** The same spread of wealth said the other way: Gini or standard deviation of log; null for other settings. */
export function otherSpread(
  path: Path,
  raw: unknown,
  order: KeyOrder,
): { readonly label: string; edit(text: string): string } | null {
  const key = path.at(-1);
  const inWealth = path.length === 3 && path[0] === 'population' && path[1] === 'wealth';
  if (!inWealth || (key !== 'gini' && key !== 'sd_log')) return null;
  const value = valueAt(raw, path);
  const to = key === 'gini' ? 'sd_log' : 'gini';
  const turned =
    typeof value !== 'number' || !(value >= 0) || (key === 'gini' && value >= 1)
      ? (starter(to) as number)
      : key === 'gini'
        ? sdLogOfGini(value)
        : // Gini of a lognormal, 2Φ(s/√2) − 1 (Aitchison and Brown 1957)
          2 * normalCdf(value / Math.SQRT2) - 1;
  const wealth: Path = path.slice(0, -1);
  return {
    label: key === 'gini' ? 'give the standard deviation of log instead' : 'give the Gini instead',
    edit: (text) => {
      const out = setValue(text, [...wealth, to], rounded(turned), order);
      return removeValue(out, path);
    },
  };
}
