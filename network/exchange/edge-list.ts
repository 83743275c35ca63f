/**
 * Edge lists: CSV with a row for each tie, `source,target[,weight]`.
 *
 * Each tie once, in either direction; ids are any text. Text in, text out: opening files is the caller's.
 */
import { InputError } from '../errors.js';
import { type Ties, toPairs } from '../graph.js';
import { csvField, eachCsvRow } from './csv.js';
import { shown } from './faults.js';
import { fileWeight, type Ids, TieReader } from './tie-reader.js';

/** Rows written at a time. */
const ROWS = 8192;

/** Ties and the id of each household. */
export interface ReadTies {
  readonly ties: Ties;
  readonly ids: readonly string[];
}

/**
 * @param text - CSV text with the columns source, target and, if ties are weighted, weight, in any order
 * @param place - name for messages
 * @param ids - the households, in the order of the result; left out: numbered by first appearance
 * @throws InputError with each fault at `place:line`: `wrong-header`, `duplicate-tie`, `loop`, `unknown-id`,
 *   `missing-id`, `missing-weight`, `negative-weight`, `bad-number`, and those of {@link eachCsvRow}
 */
export function readEdgeList(text: string, place: string, ids: Ids | null = null): ReadTies {
  const reader = new TieReader(place, ids);
  let source = -1;
  let target = -1;
  let weight = -1;
  eachCsvRow(
    text,
    place,
    (names) => {
      source = names.indexOf('source');
      target = names.indexOf('target');
      weight = names.indexOf('weight');
      const other = names.find((name) => !['source', 'target', 'weight'].includes(name));
      if (source < 0 || target < 0 || other !== undefined) {
        throw new InputError({
          code: 'wrong-header',
          place: `${place}:1`,
          problem:
            other !== undefined && source >= 0 && target >= 0
              ? `unknown column ${shown(other)}`
              : `the columns are ${names.map(shown).join(', ')}`,
          remedy: 'the header must be source,target or source,target,weight',
        });
      }
    },
    (fields, line) => {
      const w = weight < 0 ? NaN : fileWeight(fields[weight], `${place}:${line}`, reader.faults);
      reader.add(fields[source].trim(), fields[target].trim(), w, line);
    },
  );
  return reader.finish(weight >= 0);
}

/**
 * The ties as CSV, in pieces: source before target, by household order.
 *
 * @param ids - id of each household; numbers when left out
 */
export function* edgeListText(ties: Ties, ids?: readonly string[]): Generator<string> {
  const { source, target, weight } = toPairs(ties);
  const names = Array.from({ length: ties.n }, (_, i) => (ids === undefined ? String(i) : csvField(ids[i])));
  let rows: string[] = [weight === null ? 'source,target\n' : 'source,target,weight\n'];
  for (let e = 0; e < source.length; e++) {
    const pair = `${names[source[e]]},${names[target[e]]}`;
    rows.push(weight === null ? `${pair}\n` : `${pair},${weight[e]}\n`);
    if (rows.length >= ROWS) {
      yield rows.join('');
      rows = [];
    }
  }
  yield rows.join('');
}
