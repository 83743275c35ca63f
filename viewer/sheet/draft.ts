/**
 * A study as it is being written: the text, what it says so far, and every problem with its place in the text and
 * in the form.
 *
 * Problems come from the one parser (sim/study/parse.ts); this finds the setting that stands at each place. Pure.
 */
import { isMap, isScalar, isSeq, LineCounter, type Node, parseDocument } from 'yaml';
import { InputError, type Problem } from '../../network/errors.js';
import type { Study } from '../../sim/study/complete.js';
import { type ParsedStudy, parseStudy } from '../../sim/study/parse.js';
import { pathText } from '../../sim/study/problems.js';
import { type Path, type Step, valueAt } from './edit.js';

/** A problem that a form and an editor can show. */
export interface Fault {
  readonly code: string;
  /** Setting it lies with, as far as there is one; [] for the study as a whole. */
  readonly path: Path;
  /** Line and column from 1; 0 when it does not lie in the study's text. */
  readonly line: number;
  readonly column: number;
  /** Stretch of text to mark. */
  readonly from: number;
  readonly to: number;
  readonly problem: string;
  readonly remedy: string;
  /** Where, when it does not lie in the study's text (`households.csv row 212 column wealth`). */
  readonly elsewhere: string | null;
}

export interface Draft {
  readonly text: string;
  /** The YAML as plain values, or the last that could be read while the text is not YAML. */
  readonly raw: unknown;
  /** False while the text is not YAML: the form shows the last it could read and cannot edit. */
  readonly readable: boolean;
  readonly faults: readonly Fault[];
  readonly parsed: ParsedStudy | null;
  readonly study: Study | null;
  /** Where every value stands. */
  readonly spots: readonly Spot[];
}

/** A value and its key in the text. */
export interface Spot {
  readonly path: Path;
  /** Start of the key, or of the value of a list entry. */
  readonly from: number;
  readonly to: number;
  /** Start of the value. */
  readonly value: number;
}

/** Name of the text in problems of the parser, cut off again here. */
const FILE = 'study';

/**
 * Reads a text.
 *
 * @param last - the draft before, whose values stand in while the text is not YAML
 */
export function draftOf(text: string, last: Draft | null = null): Draft {
  const lines = new LineCounter();
  const document = parseDocument(text, { lineCounter: lines, prettyErrors: false, version: '1.2' });
  const readable = document.errors.length === 0;
  const spots: Spot[] = [];
  let raw: unknown = last?.raw ?? {};
  if (readable) {
    collect(document.contents, [], spots);
    try {
      raw = document.toJS({ maxAliasCount: 100 }) ?? {};
    } catch {
      // the parser says why
    }
  }
  try {
    const parsed = parseStudy(text, FILE);
    return { text, raw, readable, faults: [], parsed, study: parsed.study, spots };
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    const faults = error.problems.map((problem) => faultOf(problem, text, lines, spots));
    return { text, raw, readable, faults, parsed: null, study: null, spots };
  }
}

/** Problems of another step (reading files, building networks), placed like the parser's. */
export function faultsOf(draft: Draft, problems: readonly Problem[]): Fault[] {
  const lines = new LineCounter();
  parseDocument(draft.text, { lineCounter: lines, prettyErrors: false });
  return problems.map((problem) => faultOf(problem, draft.text, lines, draft.spots));
}

function collect(node: unknown, path: Path, spots: Spot[]): void {
  if (isMap(node)) {
    for (const pair of node.items) {
      if (!isScalar(pair.key)) continue;
      const key = (pair.key as { range?: readonly number[] | null }).range;
      const inner: Path = [...path, String(pair.key.value)];
      if (key) spots.push(spot(inner, key[0]!, key[1]!, pair.value as Node | null));
      collect(pair.value, inner, spots);
    }
  } else if (isSeq(node)) {
    node.items.forEach((item, i) => {
      const inner: Path = [...path, i];
      const range = (item as { range?: readonly number[] | null }).range;
      if (range) spots.push({ path: inner, from: range[0]!, to: range[1]!, value: range[0]! });
      collect(item, inner, spots);
    });
  }
}

function spot(path: Path, from: number, keyEnd: number, value: Node | null): Spot {
  const range = value?.range;
  if (!range || range[0] === range[1]) return { path, from, to: keyEnd, value: keyEnd };
  return { path, from, to: range[1], value: range[0] };
}

/** Faults that lie with a key, not with its value. */
const AT_KEY: ReadonlySet<string> = new Set(['unknown-key', 'keys-exclude', 'not-yet', 'duplicate-key']);

function faultOf(problem: Problem, text: string, lines: LineCounter, spots: readonly Spot[]): Fault {
  const at = /^study:(\d+):(\d+)$/.exec(problem.place);
  const { code, remedy } = problem;
  // a network that cannot be built names the part of the study instead of its line
  const part = at === null && /^arms\[\d+\]/.test(problem.place) ? pathOf(problem.place) : null;
  if (part !== null) {
    const stands = nearestSpot(spots, part);
    const from = stands?.from ?? 0;
    const { line, col } = lines.linePos(from);
    const to = stands?.to ?? from;
    return { code, path: part, line, column: col, from, to, problem: problem.problem, remedy, elsewhere: null };
  }
  if (at === null) {
    return {
      code,
      path: [],
      line: 0,
      column: 0,
      from: 0,
      to: 0,
      problem: problem.problem,
      remedy,
      elsewhere: problem.place,
    };
  }
  const line = Number(at[1]);
  const column = Number(at[2]);
  const from = Math.min(text.length, (lines.lineStarts[line - 1] ?? 0) + column - 1);
  // a map starts where its first key does: the code says which of the two is meant
  const here = spots.filter((one) => one.from === from || one.value === from);
  const byKey = AT_KEY.has(code) ? here.find((one) => one.from === from) : undefined;
  const found = byKey ?? here.find((one) => one.value === from) ?? here[0];
  let path: Path = found?.path ?? [];
  const named = /^(\S+) is missing$/.exec(problem.problem)?.[1];
  if (named !== undefined) path = pathOf(named) ?? path;
  else if (code === 'missing-key') {
    const key = /needs '(\w+)'/.exec(problem.problem)?.[1];
    if (key !== undefined) path = [...path, key];
  }
  const end = text.indexOf('\n', from);
  const lineEnd = end < 0 ? text.length : end;
  const to = code === 'unknown-key' ? endOfWord(text, from) : Math.min(found?.to ?? lineEnd, lineEnd);
  return { code, path, line, column, from, to: Math.max(to, from), problem: problem.problem, remedy, elsewhere: null };
}

function endOfWord(text: string, from: number): number {
  let to = from;
  while (to < text.length && /[^\s:,{}[\]]/.test(text[to]!)) to++;
  return to;
}

/** `arms[1].network.kind` as keys and positions, or null when it is none. */
function pathOf(text: string): Path | null {
  if (text === 'study' || !/^[a-z_]+(\[\d+\]|\.[a-z_]+)*$/i.test(text)) return text === 'study' ? ['study'] : null;
  return text
    .split(/\.|\[|\]/)
    .filter((step) => step !== '')
    .map((step): Step => (/^\d+$/.test(step) ? Number(step) : step));
}

/** The setting at a place in the text: the deepest there, or the last before it on the line (in a comment); or null. */
export function pathAt(draft: Draft, offset: number): Path | null {
  const lineStart = draft.text.lastIndexOf('\n', offset - 1) + 1;
  let inside: Spot | null = null;
  let onLine: Spot | null = null;
  for (const one of draft.spots) {
    if (one.from > offset) continue;
    if (offset <= one.to && (inside === null || one.path.length >= inside.path.length)) inside = one;
    if (one.from >= lineStart && (onLine === null || one.from >= onLine.from)) onLine = one;
  }
  if (inside !== null && inside.from >= lineStart) return inside.path;
  return (onLine ?? inside)?.path ?? null;
}

/** Where a setting stands in the text, or the nearest part of the study around it. */
export function spotOf(draft: Draft, path: Path): Spot | null {
  return nearestSpot(draft.spots, path);
}

function nearestSpot(spots: readonly Spot[], path: Path): Spot | null {
  for (let length = path.length; length > 0; length--) {
    const wanted = pathText(path.slice(0, length));
    const found = spots.find((one) => pathText(one.path) === wanted);
    if (found !== undefined) return found;
  }
  return null;
}

/** Faults that lie with a setting itself. */
export function faultsAt(faults: readonly Fault[], path: Path): Fault[] {
  const wanted = pathText(path);
  return faults.filter((fault) => pathText(fault.path) === wanted);
}

/** Faults that lie with a setting or below it. */
export function faultsWithin(faults: readonly Fault[], path: Path): Fault[] {
  return faults.filter((fault) => path.every((step, k) => fault.path[k] === step));
}

/** A value of the draft. */
export function draftValue(draft: Draft, path: Path): unknown {
  return valueAt(draft.raw, path);
}
