/**
 * Edits of a study's YAML that touch nothing but what they change: comments, order, quotes and spacing elsewhere
 * stay as the writer left them.
 *
 * Text in, text out; knows nothing of the schema but the order of keys it is handed. Each edit is spliced into the
 * text and read back: were the result to say anything else than asked for, the document is written anew by the
 * YAML library instead (comments kept, spacing not).
 */
import { isAlias, isMap, isScalar, isSeq, type Node, type Pair, parseDocument, type YAMLMap, type YAMLSeq } from 'yaml';

export type Step = string | number;
export type Path = readonly Step[];
export type Value = string | number | boolean | null | readonly Value[] | { readonly [key: string]: Value };

/** The keys of the map at a path in the order a new one is to take, or an empty list. */
export type KeyOrder = (path: Path) => readonly string[];

const NO_ORDER: KeyOrder = () => [];

/** The text is not YAML at present, so nothing can be edited but the text itself. */
export class UnreadableYaml extends Error {
  override readonly name = 'UnreadableYaml';
}

/**
 * Sets the value at a path, making the maps on the way.
 *
 * @param path - keys and list positions; a position must exist, or be the list's length to append
 * @returns the new text
 * @throws {UnreadableYaml} when the text is not YAML
 */
export function setValue(text: string, path: Path, value: Value, order: KeyOrder = NO_ORDER): string {
  const { contents, raw } = read(text);
  const wanted = withValue(raw, path, value);
  return checked(text, wanted, path, value, () => spliceSet(text, contents, path, value, order));
}

/**
 * Removes the key or list entry at a path; a map left empty goes with it. A comment behind a removed key stays, on a
 * line of its own.
 */
export function removeValue(text: string, path: Path): string {
  const { contents, raw } = read(text);
  let at = path;
  for (;;) {
    const parent = at.slice(0, -1);
    const holder = valueAt(raw, parent);
    const alone = holder !== null && typeof holder === 'object' && Object.keys(holder).length === 1;
    if (!alone || Array.isArray(holder) || parent.length === 0 || typeof parent.at(-1) === 'number') break;
    at = parent;
  }
  if (valueAt(raw, at) === undefined) return text;
  return checked(text, withoutValue(raw, at), at, undefined, () => spliceRemove(text, contents, at));
}

/** Inserts an entry into a list; a list that does not exist is made. */
export function insertItem(text: string, list: Path, index: number, value: Value, order: KeyOrder = NO_ORDER): string {
  const { contents, raw } = read(text);
  const existing = valueAt(raw, list);
  if (!Array.isArray(existing) || existing.length === 0) return setValue(text, list, [value], order);
  const items = [...(existing as Value[])];
  items.splice(index, 0, value);
  const wanted = withValue(raw, list, items);
  return checked(text, wanted, list, items, () => spliceInsert(text, contents, list, index, value));
}

/** The value at a path of parsed YAML, or undefined. */
export function valueAt(raw: unknown, path: Path): unknown {
  let at: unknown = raw;
  for (const step of path) {
    if (at === null || typeof at !== 'object') return undefined;
    at = (at as Record<Step, unknown>)[step];
  }
  return at;
}

/** The one stretch in which two texts differ, for an editor that keeps its place and its history. */
export function difference(before: string, after: string): { from: number; to: number; insert: string } | null {
  if (before === after) return null;
  const most = Math.min(before.length, after.length);
  let from = 0;
  while (from < most && before[from] === after[from]) from++;
  let tail = 0;
  while (tail < most - from && before[before.length - 1 - tail] === after[after.length - 1 - tail]) tail++;
  return { from, to: before.length - tail, insert: after.slice(from, after.length - tail) };
}

function read(text: string): { contents: unknown; raw: unknown } {
  const document = parseDocument(text, { prettyErrors: false, version: '1.2' });
  if (document.errors.length > 0) throw new UnreadableYaml(document.errors[0]!.message);
  return { contents: document.contents, raw: document.toJS({ maxAliasCount: 100 }) as unknown };
}

/** What `splice` gives when it says what is wanted, else the document as the library writes it. */
function checked(
  text: string,
  wanted: unknown,
  path: Path,
  value: Value | undefined,
  splice: () => string | null,
): string {
  const spliced = splice();
  if (spliced !== null && says(spliced, wanted)) return spliced;
  const document = parseDocument(text, { prettyErrors: false, version: '1.2' });
  if (value === undefined) document.deleteIn(path);
  else document.setIn(path, document.createNode(value));
  const written = document.toString({ lineWidth: 0 });
  if (says(written, wanted)) return written;
  throw new UnreadableYaml('the YAML uses aliases or tags that only the text can change');
}

function says(text: string, wanted: unknown): boolean {
  try {
    return same(read(text).raw, wanted);
  } catch {
    return false;
  }
}

function same(a: unknown, b: unknown): boolean {
  if (a === b) return true;
  if (a === null || b === null || typeof a !== 'object' || typeof b !== 'object') return Object.is(a, b);
  if (Array.isArray(a) !== Array.isArray(b)) return false;
  const keys = Object.keys(a);
  if (keys.length !== Object.keys(b).length) return false;
  return keys.every(
    (key) => key in b && same((a as Record<string, unknown>)[key], (b as Record<string, unknown>)[key]),
  );
}

function withValue(raw: unknown, path: Path, value: Value): unknown {
  if (path.length === 0) return value;
  const [step, ...rest] = path as [Step, ...Step[]];
  if (typeof step === 'number') {
    const list = Array.isArray(raw) ? [...(raw as unknown[])] : [];
    list[step] = withValue(list[step], rest, value);
    return list;
  }
  const map = raw !== null && typeof raw === 'object' && !Array.isArray(raw) ? { ...raw } : {};
  (map as Record<string, unknown>)[step] = withValue((map as Record<string, unknown>)[step], rest, value);
  return map;
}

function withoutValue(raw: unknown, path: Path): unknown {
  const [step, ...rest] = path as [Step, ...Step[]];
  if (Array.isArray(raw)) {
    const list = [...(raw as unknown[])];
    if (rest.length === 0) list.splice(step as number, 1);
    else list[step as number] = withoutValue(list[step as number], rest);
    return list;
  }
  const map = { ...(raw as Record<string, unknown>) };
  if (rest.length === 0) delete map[step];
  else map[step] = withoutValue(map[step], rest);
  return map;
}

// ── writing values ──────────────────────────────────────────────────────────────────────────────

const PLAIN = /^[\p{L}_][\p{L}\p{N}_ .\-–’'()/%]*$/u;
const RESERVED = /^(true|false|null|yes|no|on|off|y|n|~)$/i;

/** A scalar, plain where it reads back the same inside brackets too. */
function scalar(value: string | number | boolean | null): string {
  if (typeof value !== 'string') return value === null ? 'null' : String(value);
  const plain = PLAIN.test(value) && !RESERVED.test(value) && !/[ ]$/.test(value) && !value.includes(' #');
  return plain ? value : JSON.stringify(value);
}

function isCollection(value: Value): value is readonly Value[] | { readonly [key: string]: Value } {
  return value !== null && typeof value === 'object';
}

/** In brackets, on one line. */
function inBrackets(value: Value): string {
  if (!isCollection(value)) return scalar(value);
  if (Array.isArray(value)) return `[${(value as readonly Value[]).map(inBrackets).join(', ')}]`;
  return `{${Object.entries(value)
    .map(([key, inner]) => `${scalar(key)}: ${inBrackets(inner)}`)
    .join(', ')}}`;
}

/** Holds scalars only, or nothing: short enough for one line in brackets. */
function isFlat(value: Value): boolean {
  return !isCollection(value) || Object.values(value).every((inner) => !isCollection(inner as Value));
}

/** What follows `key:` or `-` in a block whose entries stand at `indent`. */
function behindKey(value: Value, indent: number): string {
  if (!isCollection(value) || isFlat(value)) return ` ${inBrackets(value)}`;
  const pad = ' '.repeat(indent + 2);
  if (Array.isArray(value)) {
    return (value as readonly Value[]).map((item) => `\n${pad}-${behindDash(item, indent + 2)}`).join('');
  }
  return Object.entries(value)
    .map(([key, inner]) => `\n${pad}${scalar(key)}:${behindKey(inner, indent + 2)}`)
    .join('');
}

/** What follows a dash that stands at `indent`. */
function behindDash(value: Value, indent: number): string {
  if (!isCollection(value) || isFlat(value)) return ` ${inBrackets(value)}`;
  if (Array.isArray(value)) return ` ${inBrackets(value)}`;
  const pad = ' '.repeat(indent + 2);
  return Object.entries(value)
    .map(([key, inner], k) => `${k === 0 ? ' ' : `\n${pad}`}${scalar(key)}:${behindKey(inner, indent + 2)}`)
    .join('');
}

// ── splicing ────────────────────────────────────────────────────────────────────────────────────

type Range = readonly [number, number, number];

function rangeOf(node: unknown): Range | null {
  return (node as { range?: Range | null } | null)?.range ?? null;
}

function lineStart(text: string, offset: number): number {
  return text.lastIndexOf('\n', offset - 1) + 1;
}

function lineEnd(text: string, offset: number): number {
  const end = text.indexOf('\n', offset);
  return end < 0 ? text.length : end;
}

function columnOf(text: string, offset: number): number {
  return offset - lineStart(text, offset);
}

function pairOf(map: YAMLMap, key: Step): Pair<Node, Node | null> | undefined {
  return (map.items as Pair<Node, Node | null>[]).find(
    (pair) => isScalar(pair.key) && String(pair.key.value) === String(key),
  );
}

/** End of a value without the blank lines and line break that a block carries behind it. */
function valueEnd(text: string, pair: Pair<Node, Node | null>): number {
  const key = rangeOf(pair.key)!;
  const value = rangeOf(pair.value);
  if (value === null || value[1] === value[0]) return text.indexOf(':', key[1]) + 1;
  return nodeEnd(text, value);
}

function nodeEnd(text: string, range: Range): number {
  let end = range[1];
  while (end > range[0] && /\s/.test(text[end - 1]!)) end--;
  // a comment as the last line of a block belongs behind it
  for (;;) {
    const start = lineStart(text, end);
    if (start <= range[0] || !/^\s*#/.test(text.slice(start, end))) return end;
    end = start - 1;
    while (end > range[0] && /\s/.test(text[end - 1]!)) end--;
  }
}

function splice(text: string, from: number, to: number, insert: string): string {
  return text.slice(0, from) + insert + text.slice(to);
}

function spliceSet(text: string, contents: unknown, path: Path, value: Value, order: KeyOrder): string | null {
  let node: unknown = contents;
  for (let depth = 0; depth < path.length; depth++) {
    const step = path[depth]!;
    const missing = (): Value => nested(path.slice(depth + 1), value);
    if (isMap(node)) {
      const pair = pairOf(node, step);
      if (pair === undefined) {
        return insertKey(text, node, String(step), missing(), order(path.slice(0, depth)));
      }
      const inner = pair.value;
      if (depth === path.length - 1) return replacePair(text, node, pair, value);
      if (inner === null || (isScalar(inner) && inner.value === null)) return replacePair(text, node, pair, missing());
      node = inner;
    } else if (isSeq(node)) {
      const index = step as number;
      if (index === node.items.length) return insertAt(text, node, index, missing());
      const item = node.items[index];
      if (depth === path.length - 1) return replaceItem(text, node, item, value);
      node = item;
    } else {
      return null;
    }
    if (isAlias(node)) return null;
  }
  return null;
}

function nested(path: Path, value: Value): Value {
  if (path.length === 0) return value;
  const [step, ...rest] = path as [Step, ...Step[]];
  return typeof step === 'number' ? [nested(rest, value)] : { [step]: nested(rest, value) };
}

function replacePair(text: string, map: YAMLMap, pair: Pair<Node, Node | null>, value: Value): string | null {
  const key = rangeOf(pair.key);
  if (key === null) return null;
  const range = rangeOf(pair.value);
  const empty = range === null || range[0] === range[1];
  if (!empty && isScalar(pair.value) && !isCollection(value)) {
    return splice(text, range[0], range[1], scalarLike(text.slice(range[0], range[1]), value));
  }
  const colon = text.indexOf(':', key[1]);
  if (colon < 0) return null;
  const end = empty ? colon + 1 : nodeEnd(text, range);
  const written = map.flow ? ` ${inBrackets(value)}` : behindKey(value, columnOf(text, key[0]));
  // a block cannot start on the line of a comment that followed the old value
  return splice(text, colon + 1, end, written);
}

/** Keeps the quotes that the old text had. */
function scalarLike(old: string, value: Value): string {
  if (typeof value === 'string' && old.startsWith("'") && !/['\n]/.test(value)) return `'${value}'`;
  if (typeof value === 'string' && old.startsWith('"')) return JSON.stringify(value);
  return scalar(value as string | number | boolean | null);
}

function replaceItem(text: string, seq: YAMLSeq, item: unknown, value: Value): string | null {
  const range = rangeOf(item);
  if (range === null || range[0] === range[1]) return null;
  const written = seq.flow || !isCollection(value) ? inBrackets(value) : null;
  if (written !== null) return splice(text, range[0], nodeEnd(text, range), written);
  const start = lineStart(text, range[0]);
  const dash = start + text.slice(start, range[0]).lastIndexOf('-');
  return splice(text, dash + 1, nodeEnd(text, range), behindDash(value, columnOf(text, dash)));
}

function insertKey(text: string, map: YAMLMap, key: string, value: Value, order: readonly string[]): string | null {
  const pairs = map.items as Pair<Node, Node | null>[];
  if (pairs.length === 0) {
    const range = rangeOf(map);
    return range === null ? null : splice(text, range[0], range[1], inBrackets({ [key]: value }));
  }
  // behind the last of the keys that come before it, or at the end when the order does not tell
  const place = order.indexOf(key);
  let before = pairs.length - 1;
  if (place >= 0) {
    const earlier = new Set(order.slice(0, place));
    before = -1;
    pairs.forEach((pair, p) => {
      if (isScalar(pair.key) && earlier.has(String(pair.key.value))) before = p;
    });
  }
  const first = rangeOf(pairs[0]!.key);
  if (first === null) return null;
  if (map.flow) {
    const written = `${scalar(key)}: ${inBrackets(value)}`;
    if (before < 0) return splice(text, first[0], first[0], `${written}, `);
    const end = valueEnd(text, pairs[before]!);
    return splice(text, end, end, `, ${written}`);
  }
  const indent = columnOf(text, first[0]);
  const written = `${scalar(key)}:${behindKey(value, indent)}`;
  if (before < 0) return splice(text, first[0], first[0], `${written}\n${' '.repeat(indent)}`);
  const end = lineEnd(text, valueEnd(text, pairs[before]!));
  return splice(text, end, end, `\n${' '.repeat(indent)}${written}`);
}

function spliceInsert(text: string, contents: unknown, list: Path, index: number, value: Value): string | null {
  const seq = nodeAt(contents, list);
  return isSeq(seq) ? insertAt(text, seq, index, value) : null;
}

function insertAt(text: string, seq: YAMLSeq, index: number, value: Value): string | null {
  const items = seq.items as Node[];
  if (items.length === 0) {
    const range = rangeOf(seq);
    return range === null ? null : splice(text, range[0], range[1], inBrackets([value]));
  }
  const next = rangeOf(items[index]);
  const last = rangeOf(items[index - 1]);
  if (seq.flow) {
    if (last !== null) {
      const end = nodeEnd(text, last);
      return splice(text, end, end, `, ${inBrackets(value)}`);
    }
    return next === null ? null : splice(text, next[0], next[0], `${inBrackets(value)}, `);
  }
  // the way its neighbours are written: in brackets on a line, or as a block
  const neighbour = items[Math.max(0, index - 1)];
  const range = rangeOf(neighbour);
  if (range === null) return null;
  const bracketed = (isMap(neighbour) || isSeq(neighbour)) && neighbour.flow === true;
  const start = lineStart(text, range[0]);
  const dash = start + text.slice(start, range[0]).lastIndexOf('-');
  const indent = columnOf(text, dash);
  const pad = ' '.repeat(indent);
  const written = `-${bracketed ? ` ${inBrackets(value)}` : blockDash(value, indent)}`;
  if (index === 0) return splice(text, dash, dash, `${written}\n${pad}`);
  const end = lineEnd(text, nodeEnd(text, range));
  return splice(text, end, end, `\n${pad}${written}`);
}

/** As `behindDash`, with a map's keys on lines of their own even when it is flat. */
function blockDash(value: Value, indent: number): string {
  if (!isCollection(value) || Array.isArray(value)) return behindDash(value, indent);
  const pad = ' '.repeat(indent + 2);
  const pairs = Object.entries(value);
  if (pairs.length === 0) return ' {}';
  return pairs
    .map(([key, inner], k) => `${k === 0 ? ' ' : `\n${pad}`}${scalar(key)}:${behindKey(inner, indent + 2)}`)
    .join('');
}

function nodeAt(contents: unknown, path: Path): unknown {
  let node: unknown = contents;
  for (const step of path) {
    if (isMap(node)) node = pairOf(node, step)?.value;
    else if (isSeq(node)) node = node.items[step as number];
    else return undefined;
  }
  return node;
}

function spliceRemove(text: string, contents: unknown, path: Path): string | null {
  const holder = nodeAt(contents, path.slice(0, -1));
  const step = path.at(-1)!;
  if (isMap(holder)) {
    const pairs = holder.items as Pair<Node, Node | null>[];
    const index = pairs.findIndex((pair) => isScalar(pair.key) && String(pair.key.value) === String(step));
    const pair = pairs[index];
    const key = rangeOf(pair?.key);
    if (pair === undefined || key === null) return null;
    const end = valueEnd(text, pair);
    if (holder.flow) {
      const next = rangeOf(pairs[index + 1]?.key);
      if (pairs.length === 1) return splice(text, key[0], end, '');
      if (next !== null && index === 0) return splice(text, key[0], next[0], '');
      if (index > 0) return splice(text, valueEnd(text, pairs[index - 1]!), end, '');
      return null;
    }
    if (pairs.length === 1) {
      const range = rangeOf(holder);
      return range === null ? null : splice(text, range[0], nodeEnd(text, range), '{}');
    }
    const stop = lineEnd(text, end);
    const comment = /^\s*(#.*)$/.exec(text.slice(end, stop))?.[1];
    const start = lineStart(text, key[0]);
    const dashed = text.slice(start, key[0]).trim() !== '';
    if (dashed) {
      // the first key beside a dash: the next one takes its place
      const next = rangeOf(pairs[index + 1]?.key);
      if (next === null) return null;
      return splice(
        text,
        key[0],
        next[0],
        comment === undefined ? '' : `${comment}\n${' '.repeat(columnOf(text, next[0]))}`,
      );
    }
    if (comment !== undefined) return splice(text, key[0], end + /^\s*/.exec(text.slice(end))![0].length, '');
    return splice(text, start, Math.min(text.length, stop + 1), '');
  }
  if (isSeq(holder)) {
    const items = holder.items as Node[];
    const index = step as number;
    const range = rangeOf(items[index]);
    if (range === null) return null;
    if (items.length === 1) {
      const all = rangeOf(holder);
      return all === null ? null : splice(text, all[0], nodeEnd(text, all), '[]');
    }
    if (holder.flow) {
      const next = rangeOf(items[index + 1]);
      if (index === 0 && next !== null) return splice(text, range[0], next[0], '');
      const last = rangeOf(items[index - 1]);
      return last === null ? null : splice(text, nodeEnd(text, last), nodeEnd(text, range), '');
    }
    const start = lineStart(text, range[0]);
    const dash = start + text.slice(start, range[0]).lastIndexOf('-');
    const from = text.slice(start, dash).trim() === '' ? start : dash;
    const stop = lineEnd(text, nodeEnd(text, range));
    return splice(text, from, Math.min(text.length, stop + 1), '');
  }
  return null;
}
