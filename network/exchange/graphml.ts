/**
 * GraphML (Brandes et al. 2002; graphml.graphdrawing.org): one undirected graph with weights and household attributes.
 *
 * Reads with saxes, a strict streaming XML parser that knows its line, which the graph library's reader (it needs a
 * document tree and gives no places) does not. Directed graphs, hyperedges and nested graphs are refused, ports
 * ignored. Text in, text out: opening files is the caller's.
 */
import { SaxesParser, type SaxesTagPlain } from 'saxes';
import { InputError } from '../errors.js';
import { type Ties, toPairs } from '../graph.js';
import type { ReadTies } from './edge-list.js';
import { shown } from './faults.js';
import { fileNumber, fileWeight, type Ids, TieReader } from './tie-reader.js';

/** A household attribute: numbers (NaN = missing) or text ('' = missing), length n. */
export interface Column {
  readonly name: string;
  readonly values: Float64Array | readonly string[];
}

export interface ReadGraphml extends ReadTies {
  readonly columns: readonly Column[];
}

interface Key {
  readonly target: string;
  readonly name: string;
  readonly numeric: boolean;
  default: string | null;
  values: Map<number, string>;
}

interface Edge {
  readonly a: string;
  readonly b: string;
  readonly line: number;
  weight: string | null;
}

/**
 * @param text - a GraphML document
 * @param place - name for messages
 * @param ids - households known beforehand, in the order of the result; nodes with other ids are refused, and
 *   households without a node are isolates. Left out: nodes in file order
 * @throws InputError with each fault at `place:line`: `not-graphml`, `directed`, `unsupported`, `duplicate-node`,
 *   `missing-id`, `unknown-key`, `unknown-id`, `duplicate-tie`, `loop`, `missing-weight`, `negative-weight`, `bad-number`
 */
export function readGraphml(text: string, place: string, ids: Ids | null = null): ReadGraphml {
  const reader = new TieReader(place, ids);
  const { faults } = reader;
  const keys = new Map<string, Key>();
  const edges: Edge[] = [];
  const open: string[] = [];
  const nodes = new Set<string>();
  let graphs = 0;
  let node = -1;
  let edge: Edge | null = null;
  let key: Key | null = null;
  let data: string | null = null;
  const parser = new SaxesParser();
  const here = (): string => `${place}:${parser.line}`;
  const fail = (code: string, problem: string, remedy: string): InputError =>
    new InputError({ code, place: here(), problem, remedy });

  parser.on('error', (error) => {
    // the library writes `line:column: message`
    throw fail(
      'not-graphml',
      `this is not well-formed XML: ${error.message.replace(/^\d+:\d+: /, '')}`,
      'mend it there',
    );
  });
  parser.on('opentag', (tag: SaxesTagPlain) => {
    const name = local(tag.name);
    const a = tag.attributes;
    const parent = open.at(-1);
    open.push(name);
    if (parent === undefined && name !== 'graphml') {
      throw fail('not-graphml', `the document is <${name}>, not <graphml>`, 'give a GraphML file');
    }
    switch (name) {
      case 'key':
        keys.set(a['id'] ?? '', {
          target: a['for'] ?? 'all',
          name: a['attr.name'] ?? a['id'] ?? '',
          numeric: ['int', 'long', 'float', 'double'].includes(a['attr.type'] ?? 'string'),
          default: null,
          values: new Map(),
        });
        key = keys.get(a['id'] ?? '') ?? null;
        return;
      case 'default':
        data = '';
        return;
      case 'graph':
        if (parent !== 'graphml' || ++graphs > 1) {
          throw fail('unsupported', 'the file holds more than one graph, or one inside another', 'keep one graph');
        }
        if (a['edgedefault'] !== 'undirected') {
          throw fail(
            'directed',
            `the graph's edgedefault is ${shown(a['edgedefault'] ?? '')}: ties here have no direction`,
            'make it undirected (decide what a one-way tie means) and write edgedefault="undirected"',
          );
        }
        return;
      case 'node': {
        const id = a['id'] ?? '';
        node = -1;
        if (id === '') faults.add('missing-id', here(), 'a node has no id', 'give it one');
        else if (nodes.has(id)) faults.add('duplicate-node', here(), `node ${shown(id)} appears twice`, 'keep one');
        else {
          nodes.add(id);
          node = ids === null ? reader.addHousehold(id) : reader.indexOf(id);
          if (node < 0)
            faults.add('unknown-id', here(), `there is no household ${shown(id)}`, 'use the ids of the households');
        }
        return;
      }
      case 'edge':
        if (a['directed'] === 'true') {
          faults.add('directed', here(), 'the edge is directed: ties here have no direction', 'drop directed="true"');
        }
        edge = { a: a['source'] ?? '', b: a['target'] ?? '', line: parser.line, weight: null };
        edges.push(edge);
        return;
      case 'data':
        if (parent !== 'node' && parent !== 'edge') return;
        key = keys.get(a['key'] ?? '') ?? null;
        if (key === null)
          faults.add('unknown-key', here(), `no <key> has the id ${shown(a['key'] ?? '')}`, 'declare it');
        data = '';
        return;
      case 'hyperedge':
        throw fail('unsupported', 'hyperedges join more than two', 'replace them by edges');
    }
  });
  const addText = (piece: string): void => {
    if (data !== null) data += piece;
  };
  parser.on('text', addText);
  parser.on('cdata', addText);
  parser.on('closetag', (tag: SaxesTagPlain) => {
    const name = local(tag.name);
    open.pop();
    if (name === 'default' && key !== null) key.default = (data ?? '').trim();
    if (name === 'data' && data !== null && key !== null) {
      const value = data.trim();
      if (open.at(-1) === 'edge') {
        if (edge !== null && key.name.toLowerCase() === 'weight') edge.weight = value;
      } else if (node >= 0) {
        if (key.numeric && value !== '' && Number.isNaN(fileNumber(value)) && value !== 'NaN') {
          faults.add('bad-number', here(), `${key.name} is ${shown(value)}, not a number`, 'write it like 0.5');
        }
        key.values.set(node, value);
      }
    }
    if (name === 'data' || name === 'default') data = null;
    if (name === 'key' || name === 'data') key = null;
    if (name === 'edge') edge = null;
    if (name === 'node') node = -1;
  });
  // in pieces: one string of a large file would be copied whole
  for (let at = 0; at < text.length; at += 1 << 20) parser.write(text.slice(at, at + (1 << 20)));
  parser.close();
  if (graphs === 0) throw fail('not-graphml', 'the file holds no <graph>', 'give a GraphML file with one graph');

  const weightKey = [...keys.values()].find((k) => k.name.toLowerCase() === 'weight' && k.target !== 'node');
  const weighted =
    edges.length > 0 && weightKey !== undefined && (weightKey.default !== null || edges.some((e) => e.weight !== null));
  for (const e of edges) {
    // the nodes of a file are declared in it, wherever: an edge to another is a mistake, not a new household
    let known = true;
    for (const id of [e.a, e.b]) {
      if (id === '' || nodes.has(id)) continue;
      known = false;
      faults.add('unknown-id', `${place}:${e.line}`, `there is no node ${shown(id)}`, 'declare it with <node>');
    }
    if (!known) continue;
    const w = weighted ? fileWeight(e.weight ?? weightKey.default ?? '', `${place}:${e.line}`, faults) : NaN;
    reader.add(e.a, e.b, w, e.line);
  }
  const { ties, ids: names } = reader.finish(weighted);
  const columns: Column[] = [];
  for (const k of keys.values()) {
    if (k.target === 'edge' || k.target === 'graph' || (k.values.size === 0 && k.default === null)) continue;
    const cell = (i: number): string => k.values.get(i) ?? k.default ?? '';
    columns.push({
      name: k.name,
      values: k.numeric
        ? Float64Array.from({ length: ties.n }, (_, i) => (cell(i) === '' ? NaN : Number(cell(i))))
        : Array.from({ length: ties.n }, (_, i) => cell(i)),
    });
  }
  return { ties, ids: names, columns };
}

/** Name of a tag without a namespace prefix. */
function local(name: string): string {
  return name.slice(name.indexOf(':') + 1);
}

/**
 * The ties as a GraphML document, in pieces.
 *
 * @param ids - id of each household; numbers when left out
 * @param columns - household attributes; missing values (NaN, '') are left out
 * @throws InputError `not-xml` when an id or a value holds a character that XML cannot
 */
export function* graphmlText(ties: Ties, ids?: readonly string[], columns: readonly Column[] = []): Generator<string> {
  const { source, target, weight } = toPairs(ties);
  const name = (i: number): string => escaped(ids === undefined ? String(i) : ids[i]);
  let piece = '<?xml version="1.0" encoding="UTF-8"?>\n<graphml xmlns="http://graphml.graphdrawing.org/xmlns">\n';
  columns.forEach(({ name: column, values }, c) => {
    const type = values instanceof Float64Array ? 'double' : 'string';
    piece += `  <key id="h${c}" for="node" attr.name="${escaped(column)}" attr.type="${type}"/>\n`;
  });
  if (weight !== null) piece += '  <key id="weight" for="edge" attr.name="weight" attr.type="double"/>\n';
  piece += '  <graph edgedefault="undirected">\n';
  for (let i = 0; i < ties.n; i++) {
    let data = '';
    columns.forEach(({ values }, c) => {
      const value = values[i];
      if (value === '' || (typeof value === 'number' && Number.isNaN(value))) return;
      data += `<data key="h${c}">${escaped(String(value))}</data>`;
    });
    piece += data === '' ? `    <node id="${name(i)}"/>\n` : `    <node id="${name(i)}">${data}</node>\n`;
    if (piece.length > 65_536) {
      yield piece;
      piece = '';
    }
  }
  for (let e = 0; e < source.length; e++) {
    const ends = `source="${name(source[e])}" target="${name(target[e])}"`;
    piece +=
      weight === null ? `    <edge ${ends}/>\n` : `    <edge ${ends}><data key="weight">${weight[e]}</data></edge>\n`;
    if (piece.length > 65_536) {
      yield piece;
      piece = '';
    }
  }
  yield `${piece}  </graph>\n</graphml>\n`;
}

function escaped(text: string): string {
  for (let at = 0; at < text.length; at++) {
    const code = text.charCodeAt(at);
    if ((code < 32 && code !== 9 && code !== 10 && code !== 13) || code === 0xfffe || code === 0xffff) {
      throw new InputError({
        code: 'not-xml',
        place: shown(text),
        problem: 'it holds a control character, which XML cannot',
        remedy: 'rename it, or write CSV',
      });
    }
  }
  return text
    .replaceAll('&', '&amp;')
    .replaceAll('<', '&lt;')
    .replaceAll('>', '&gt;')
    .replaceAll('"', '&quot;')
    .replaceAll('\t', '&#9;')
    .replaceAll('\n', '&#10;')
    .replaceAll('\r', '&#13;');
}
