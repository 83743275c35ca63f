/**
 * A tie file of either format, by its ending.
 */
import { InputError } from '../errors.js';
import type { Ties } from '../graph.js';
import { readEdgeList } from './edge-list.js';
import { type ReadGraphml, readGraphml } from './graphml.js';
import type { Ids } from './tie-reader.js';

/**
 * Reads `.csv` as an edge list and `.graphml` (or `.xml`) as GraphML.
 *
 * @param text - the file's text
 * @param path - its name, for the ending and for messages
 * @param ids - ids of the households in order, their number when ids are 0 … n−1, or null to take the file's own
 * @throws InputError `unknown-format` for another ending, and those of {@link readEdgeList}, {@link readGraphml}
 */
export function readGraph(text: string, path: string, ids: Ids | null): ReadGraphml {
  const ending = path.slice(path.lastIndexOf('.') + 1).toLowerCase();
  if (ending === 'csv') return { ...readEdgeList(text, path, ids), columns: [] };
  if (ending === 'graphml' || ending === 'xml') return readGraphml(text, path, ids);
  throw new InputError({
    code: 'unknown-format',
    place: path,
    problem: `files ending in .${ending} are not read as ties`,
    remedy: 'give .csv (source,target[,weight]) or .graphml',
  });
}

/** The ties alone, among known households. @throws as {@link readGraph} */
export function readTies(text: string, path: string, ids: Ids): Ties {
  return readGraph(text, path, ids).ties;
}
