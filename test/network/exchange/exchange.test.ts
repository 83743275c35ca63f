import fc from 'fast-check';
import { expect, test } from 'vitest';
import { build } from '../../../network/build/build.js';
import { InputError, type Problem } from '../../../network/errors.js';
import { readCsv } from '../../../network/exchange/csv.js';
import { edgeListText, readEdgeList } from '../../../network/exchange/edge-list.js';
import { graphmlText, readGraphml } from '../../../network/exchange/graphml.js';
import { fromGraphology, toGraphology } from '../../../network/exchange/graphology.js';
import { readGraph, readTies } from '../../../network/exchange/read-ties.js';
import { fromPairs, type Ties, toPairs } from '../../../network/graph.js';
import { households, stream } from '../stream.js';

/** Problems that reading raises; fails when it raises none, or another error. */
function problems(read: () => unknown): readonly Problem[] {
  try {
    read();
  } catch (error) {
    if (error instanceof InputError) return error.problems;
    throw error;
  }
  throw new Error('nothing was refused');
}

const graphml = (inside: string, edgedefault = 'undirected', keys = ''): string =>
  `<?xml version="1.0" encoding="UTF-8"?>\n<graphml xmlns="http://graphml.graphdrawing.org/xmlns">\n${keys}<graph edgedefault="${edgedefault}">\n${inside}</graph>\n</graphml>\n`;

test.each([
  ['an empty file', '', 'empty-file', 'ties.csv:1', /empty/],
  ['only blank lines', '\n\n', 'empty-file', 'ties.csv:1', /empty/],
  ['another header', 'from,to\na,b\n', 'wrong-header', 'ties.csv:1', /"from", "to"/],
  ['a column too many', 'source,target,colour\na,b,red\n', 'wrong-header', 'ties.csv:1', /unknown column "colour"/],
  ['a column twice', 'source,source\na,b\n', 'wrong-header', 'ties.csv:1', /"source" appears twice/],
  ['a column without a name', 'source,target,\na,b,1\n', 'wrong-header', 'ties.csv:1', /no name/],
  ['a short row', 'source,target\na,b\nc\n', 'ragged-row', 'ties.csv:3', /1 field, the header has 2/],
  ['a long row', 'source,target\na,b\nc,d,e\n', 'ragged-row', 'ties.csv:3', /3 fields, the header has 2/],
  ['an open quote', 'source,target\na,b\n"c,d\ne,f\n', 'bad-quotes', 'ties.csv:3', /never closed/],
  ['text after a quote', 'source,target\n"a"x,b\n', 'bad-quotes', 'ties.csv:2', /closing quote/],
  ['a tie twice', 'source,target\na,b\nb,c\na,b\n', 'duplicate-tie', 'ties.csv:4', /"a" and "b" was given on line 2/],
  ['a tie reversed', 'source,target\na,b\nb,a\n', 'duplicate-tie', 'ties.csv:3', /on line 2/],
  ['a loop', 'source,target\na,b\nc,c\n', 'loop', 'ties.csv:3', /"c" is tied to itself/],
  ['no id', 'source,target\na,\n', 'missing-id', 'ties.csv:2', /without a household/],
  ['no weight', 'source,target,weight\na,b,1\nb,c,\n', 'missing-weight', 'ties.csv:3', /no weight/],
  ['a negative weight', 'source,target,weight\na,b,-2\n', 'negative-weight', 'ties.csv:2', /-2 is negative/],
  ['a word as weight', 'source,target,weight\na,b,much\n', 'bad-number', 'ties.csv:2', /"much" is not a number/],
  ['a decimal comma', 'source,target,weight\na,b,"0,5"\n', 'bad-number', 'ties.csv:2', /"0,5"/],
  ['a hexadecimal weight', 'source,target,weight\na,b,0x10\n', 'bad-number', 'ties.csv:2', /"0x10"/],
  ['an endless weight', 'source,target,weight\na,b,1e999\n', 'bad-number', 'ties.csv:2', /"1e999"/],
])('an edge list with %s is refused with its line', (_, text, code, place, problem) => {
  const [first] = problems(() => readEdgeList(text, 'ties.csv'));
  expect(first.code).toBe(code);
  expect(first.place).toBe(place);
  expect(first.problem).toMatch(problem);
  expect(first.remedy.length).toBeGreaterThan(3);
});

test('an unknown household is refused with the nearest id', () => {
  const ids = ['Haven', 'Mill', 'Ridge'];
  const [first] = problems(() => readEdgeList('source,target\nHaven,Mill\nHaven,Rigde\n', 'ties.csv', ids));
  expect(first).toMatchObject({ code: 'unknown-id', place: 'ties.csv:3', remedy: 'did you mean "Ridge"?' });
  expect(problems(() => readTies('source,target\n0,3\n', 'ties.csv', 3))[0].code).toBe('unknown-id');
});

test('every fault of a file is told, up to twenty', () => {
  const rows = Array.from({ length: 50 }, (_, i) => `${i},${i}`).join('\n');
  expect(problems(() => readEdgeList(`source,target\n${rows}`, 'ties.csv')).length).toBe(20);
  const two = problems(() => readEdgeList('source,target,weight\na,a,1\nb,c,x\n', 'ties.csv'));
  expect(two.map((p) => p.place).sort()).toEqual(['ties.csv:2', 'ties.csv:3']);
});

test('lines are those of the file, quoted line breaks, blank lines and any line ending counted', () => {
  for (const end of ['\n', '\r\n', '\r']) {
    const text = ['\ufeffid,note', 'a,"two', 'lines"', '', 'b,plain', 'c'].join(end);
    const [first] = problems(() => readCsv(text, 'notes.csv'));
    expect(first).toMatchObject({ code: 'ragged-row', place: 'notes.csv:6' });
    const table = readCsv(text.slice(0, -2), 'notes.csv');
    expect(table.header).toEqual(['id', 'note']);
    expect(Array.from(table.lines)).toEqual([2, 5]);
    expect(table.rows).toEqual([
      ['a', 'two\nlines'],
      ['b', 'plain'],
    ]);
  }
});

test('a file longer than one piece of parsing keeps every row and line', () => {
  const n = 120_000;
  const rows = Array.from({ length: n }, (_, i) => (i % 1000 === 7 ? `"r${i}\nx",${i}` : `r${i},${i}`));
  const table = readCsv(`id,value\n${rows.join('\n')}\n`, 'long.csv');
  expect(table.rows.length).toBe(n);
  let line = 2;
  for (let i = 0; i < n; i++) {
    if (table.lines[i] !== line || table.rows[i][1] !== String(i)) throw new Error(`row ${i}: line ${table.lines[i]}`);
    line += i % 1000 === 7 ? 2 : 1;
  }
  rows[110_000] = '"x"y,1';
  rows[115_000] = '"open,1';
  const found = problems(() => readCsv(`id,value\n${rows.join('\n')}\n`, 'long.csv'));
  expect(found.map((p) => p.place)).toEqual([110_000, 115_000].map((i) => `long.csv:${table.lines[i]}`));
});

test.each([
  ['a directed graph', graphml('<node id="a"/>\n', 'directed'), 'directed', 3, /"directed"/],
  [
    'a directed edge',
    graphml('<node id="a"/>\n<node id="b"/>\n<edge source="a" target="b" directed="true"/>\n'),
    'directed',
    6,
    /edge is directed/,
  ],
  ['no graph', '<graphml></graphml>', 'not-graphml', 1, /no <graph>/],
  ['another document', '<html></html>', 'not-graphml', 1, /<html>/],
  ['an empty file', '', 'not-graphml', 1, /well-formed/],
  ['a broken tag', graphml('<node id="a">\n<node id=b/>\n'), 'not-graphml', 5, /well-formed XML/],
  ['an open tag', '<graphml>\n<graph edgedefault="undirected">\n<node id="a">\n', 'not-graphml', 4, /well-formed/],
  [
    'two graphs',
    '<graphml>\n<graph edgedefault="undirected"/>\n<graph edgedefault="undirected"/></graphml>',
    'unsupported',
    3,
    /more than one graph/,
  ],
  ['a hyperedge', graphml('<hyperedge/>\n'), 'unsupported', 4, /more than two/],
  ['a node twice', graphml('<node id="a"/>\n<node id="a"/>\n'), 'duplicate-node', 5, /"a" appears twice/],
  ['a node without id', graphml('<node/>\n'), 'missing-id', 4, /no id/],
  ['an edge to nowhere', graphml('<node id="a"/>\n<edge source="a" target="z"/>\n'), 'unknown-id', 5, /no node "z"/],
  ['a loop', graphml('<node id="a"/>\n<edge source="a" target="a"/>\n'), 'loop', 5, /tied to itself/],
  [
    'a tie twice',
    graphml('<node id="a"/>\n<node id="b"/>\n<edge source="a" target="b"/>\n<edge source="b" target="a"/>\n'),
    'duplicate-tie',
    7,
    /line 6/,
  ],
  ['an unknown key', graphml('<node id="a"><data key="k">1</data></node>\n'), 'unknown-key', 4, /"k"/],
])('GraphML with %s is refused with its line', (_, text, code, line, problem) => {
  const [first] = problems(() => readGraphml(text, 'net.graphml'));
  expect(first.code).toBe(code);
  expect(first.place).toBe(`net.graphml:${line}`);
  expect(first.problem).toMatch(problem);
});

const WEIGHT = '<key id="w" for="edge" attr.name="weight" attr.type="double"/>\n';

test.each([
  ['missing on one', '', 'missing-weight'],
  ['a word', '<data key="w">many</data>', 'bad-number'],
  ['negative', '<data key="w">-1</data>', 'negative-weight'],
])('GraphML weights: %s', (_, data, code) => {
  const edges = `<edge source="a" target="b"><data key="w">2</data></edge>\n<edge source="b" target="c">${data}</edge>\n`;
  const text = graphml(`<node id="a"/>\n<node id="b"/>\n<node id="c"/>\n${edges}`, 'undirected', WEIGHT);
  expect(problems(() => readGraphml(text, 'net.graphml'))[0]).toMatchObject({ code, place: 'net.graphml:9' });
});

test('GraphML: attributes with defaults, edges before nodes, and a number that is none', () => {
  const keys =
    '<key id="y" for="node" attr.name="wealth" attr.type="double"/>\n<key id="v" for="node" attr.name="village" attr.type="string"><default>Mill</default></key>\n';
  const inside =
    '<edge source="n1" target="n2"/>\n<node id="n1"><data key="y">12.5</data></node>\n<node id="n2"><data key="v">Up &amp; over</data></node>\n';
  const read = readGraphml(graphml(inside, 'undirected', keys), 'net.graphml');
  expect(read.ids).toEqual(['n1', 'n2']);
  expect(read.columns).toEqual([
    { name: 'wealth', values: Float64Array.of(12.5, NaN) },
    { name: 'village', values: ['Mill', 'Up & over'] },
  ]);
  expect([...read.ties.target]).toEqual([1, 0]);
  const bad = inside.replace('12.5', 'twelve');
  expect(problems(() => readGraphml(graphml(bad, 'undirected', keys), 'net.graphml'))[0]).toMatchObject({
    code: 'bad-number',
    place: 'net.graphml:7',
  });
});

test('GraphML among known households: their order holds, those without a node are isolates', () => {
  const text = graphml('<node id="b"/>\n<node id="a"/>\n<edge source="a" target="b"/>\n');
  const read = readGraphml(text, 'net.graphml', ['a', 'b', 'c']);
  expect(read.ids).toEqual(['a', 'b', 'c']);
  expect([...read.ties.start]).toEqual([0, 1, 2, 2]);
  expect(problems(() => readGraphml(text, 'net.graphml', ['a', 'c']))[0]).toMatchObject({
    code: 'unknown-id',
    place: 'net.graphml:4',
  });
});

test('the format goes by the ending', () => {
  expect(readGraph('source,target\na,b\n', 'x/ties.CSV', null).ids).toEqual(['a', 'b']);
  expect(readGraph(graphml('<node id="a"/>\n'), 'net.graphml', null).ids).toEqual(['a']);
  expect(problems(() => readGraph('', 'ties.xlsx', null))[0]).toMatchObject({
    code: 'unknown-format',
    place: 'ties.xlsx',
  });
});

/** Any weighted or plain network with any ids that XML can hold. */
const anyNetwork = fc
  .record({
    ids: fc.uniqueArray(fc.string({ unit: 'grapheme', minLength: 1, maxLength: 6 }).filter(writable), {
      minLength: 1,
      maxLength: 12,
    }),
    pairs: fc.array(fc.tuple(fc.nat(11), fc.nat(11)), { maxLength: 30 }),
    weights: fc.option(
      fc.array(fc.double({ min: 0, noNaN: true, noDefaultInfinity: true }), { minLength: 30, maxLength: 30 }),
    ),
  })
  .map(({ ids, pairs, weights }) => {
    const n = ids.length;
    const keys = new Set<number>();
    for (const [a, b] of pairs) {
      const i = a % n;
      const j = b % n;
      if (i !== j) keys.add(Math.min(i, j) * n + Math.max(i, j));
    }
    const list = [...keys];
    const ties = fromPairs(
      n,
      Uint32Array.from(list, (k) => Math.floor(k / n)),
      Uint32Array.from(list, (k) => k % n),
      weights === null || list.length === 0 ? null : Float64Array.from(list, (_, e) => weights[e]),
    );
    return { ids, ties };
  });

/** Ids as files keep them: spaces at the ends are not part of an id. */
function writable(id: string): boolean {
  // biome-ignore lint/suspicious/noControlCharactersInRegex: control characters are what XML cannot hold
  return id.trim() === id && !/[\u0000-\u001f\ufffe\uffff]|\p{Surrogate}/u.test(id);
}

test('an edge list reads back as it was written, weights to the last digit', () => {
  fc.assert(
    fc.property(anyNetwork, ({ ids, ties }) => {
      const text = [...edgeListText(ties, ids)].join('');
      expectSame(readEdgeList(text, 'ties.csv', ids).ties, ties);
    }),
  );
});

test('GraphML reads back as it was written, with weights and attributes', () => {
  fc.assert(
    fc.property(anyNetwork, ({ ids, ties }) => {
      const columns = [
        { name: 'wealth', values: Float64Array.from(ids, (_, i) => (i % 3 === 0 ? NaN : i / 7)) },
        { name: 'a "name" & <more>', values: ids.map((id, i) => (i % 2 === 0 ? '' : id)) },
      ];
      const read = readGraphml([...graphmlText(ties, ids, columns)].join(''), 'net.graphml');
      expect(read.ids).toEqual(ids);
      expectSame(read.ties, ties);
      const kept = columns.filter((c) => [...c.values].some((v) => v !== '' && !Number.isNaN(v)));
      expect(read.columns).toEqual(kept);
    }),
  );
});

test('a graphology graph and back', () => {
  fc.assert(
    fc.property(anyNetwork, ({ ids, ties }) => {
      const back = fromGraphology(toGraphology(ties, ids, { wealth: ids.map((_, i) => i) }));
      expect(back.ids).toEqual(ids);
      expectSame(back.ties, ties);
    }),
  );
});

function expectSame(a: Ties, b: Ties): void {
  expect(a.n).toBe(b.n);
  expect(a.start).toEqual(b.start);
  expect(a.target).toEqual(b.target);
  expect(a.weight).toEqual(b.weight);
}

test('a control character in an id cannot be written as GraphML', () => {
  const ties = fromPairs(2, Uint32Array.of(0), Uint32Array.of(1), null);
  expect(problems(() => [...graphmlText(ties, ['a', 'b\u0001'])])[0].code).toBe('not-xml');
});

test('long files are written in pieces that join to the whole', () => {
  const ties = build({ kind: 'random', mean_degree: 10 }, households(5000, 1), stream('long'));
  const pieces = [...edgeListText(ties)];
  expect(pieces.length).toBeGreaterThan(2);
  const read = readTies(pieces.join(''), 'ties.csv', 5000);
  expect(toPairs(read)).toEqual(toPairs(ties));
});
