/**
 * A directed network read without its directions: what of the set `net-emon-texas` applies to undirected ties (R igraph
 * 1.3.5 and networkx 2.8.8, two routes; see SOURCES.md).
 */
import { expect, test } from 'vitest';
import { InputError } from '../../network/errors.js';
import { readEdgeList } from '../../network/exchange/edge-list.js';
import { fromPairs, type Ties, tieCount } from '../../network/graph.js';
import { components } from '../../network/measure/components.js';
import { groupTies, modularity } from '../../network/measure/mixing-by-group.js';
import { clustering } from '../../network/measure/triangles.js';
import { checksOf, columnsOf } from './expected.js';
import { codes, expectDefined } from './net.js';

const checks = checksOf('net-emon-texas');
const nodes = columnsOf('net-emon-texas', 'nodes.csv');
const arcs = columnsOf('net-emon-texas', 'edges.csv');

/** Ties where at least `answers` of the two arcs are there, among the nodes kept. */
function undirected(answers: 1 | 2, kept: readonly string[]): Ties {
  const seen = new Map<string, number>();
  arcs['source'].forEach((s, e) => {
    const a = kept.indexOf(s);
    const b = kept.indexOf(arcs['target'][e]);
    if (a < 0 || b < 0) return;
    const key = `${Math.min(a, b)} ${Math.max(a, b)}`;
    seen.set(key, (seen.get(key) ?? 0) + 1);
  });
  const pairs = [...seen].filter(([, k]) => k >= answers).map(([key]) => key.split(' ').map(Number));
  return fromPairs(kept.length, Uint32Array.from(pairs, (p) => p[0]), Uint32Array.from(pairs, (p) => p[1]), null);
}

test('counts ties where any arc, or both, make one', () => {
  const any = undirected(1, nodes['id']);
  expectDefined(tieCount(any), checks['undirected.m'], 'undirected.m');
  expectDefined(clustering(any).transitivity, checks['undirected.transitivity'], 'undirected.transitivity');
  expectDefined(components(any).sizes, checks['components.weak'], 'components.weak');
  expectDefined(tieCount(undirected(2, nodes['id'])), checks['mutual.m'], 'mutual.m');
});

test.each(['sponsorship', 'location'])('modularity by %s, nodes without it left out', (name) => {
  const kept = nodes['id'].filter((_, i) => nodes[name][i] !== '');
  const { group } = codes(nodes[name].filter((label) => label !== ''));
  const id = `modularity_undirected.${name}`;
  expectDefined(modularity(groupTies(undirected(1, kept), group)), checks[id], id);
});

test('its arc list is refused as an edge list, every answered arc by its line', () => {
  const text = `source,target\n${arcs['source'].map((s, e) => `${s},${arcs['target'][e]}`).join('\n')}\n`;
  try {
    readEdgeList(text, 'arcs.csv');
    expect.unreachable('arcs that answer each other are second ties');
  } catch (error) {
    expect(error).toBeInstanceOf(InputError);
    expect((error as InputError).problems[0].code).toBe('duplicate-tie');
  }
});
