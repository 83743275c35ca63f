/**
 * The form: every setting of the study schema as a control with its sentence, usual range and problems.
 *
 * Templates over a draft; an edit is handed on as a function of the YAML text, so that the text stays the only
 * place where the study lives. Knows the kinds of field, not the study's particulars: those are in words.ts and
 * rules.ts.
 */
import { html, nothing, type TemplateResult } from 'lit-html';
import { live } from 'lit-html/directives/live.js';
import { pathText } from '../../sim/study/problems.js';
import { type Draft, draftValue, type Fault } from './draft.js';
import { insertItem, type KeyOrder, type Path, removeValue, setValue, type Value } from './edit.js';
import {
  type ChoiceField,
  type Field,
  fieldAt,
  type GroupField,
  type ListField,
  rangeWords,
  type UnionField,
  variantAt,
} from './fields.js';
import { begun, belongs, follow, turn } from './rules.js';
import { alternative, choiceWord, ENTRY, LEFT_OUT } from './words.js';

export interface FormContext {
  readonly draft: Draft;
  readonly root: GroupField;
  readonly faults: readonly Fault[];
  /** Control the reader is typing in, whose text is left as typed while it means the same. */
  readonly active: Element | null;
  /** Setting marked from the text's side. */
  readonly at: Path | null;
  /** Names of the files at hand, to choose from. */
  readonly files: readonly string[];
  readonly order: KeyOrder;
  /** Changes the text. `then` names the setting the keyboard goes to. */
  edit(change: (text: string) => string, then?: Path): void;
  /** Words a text may take because something else of the study names them (other arms, columns of a file), or null. */
  words(path: Path): readonly string[] | null;
  /** A switch of the spread of wealth, or null where there is none: its label and its edit. */
  other(path: Path): { readonly label: string; edit(text: string): string } | null;
}

/** Identifier of a setting's control. */
export function controlId(path: Path): string {
  return `set-${path.join('-')}`;
}

/** Order of keys by the schema. */
export function keyOrder(root: GroupField, raw: () => unknown): KeyOrder {
  return (path) => {
    const field = fieldAt(root, path, raw());
    if (field === null) return [];
    if (field.kind === 'group') return keysOf(field);
    if (field.kind !== 'union') return [];
    const marks = field.variants.flatMap((variant) => (variant.mark === null ? [] : [variant.mark.key]));
    const keys = field.variants.flatMap(({ field: inner }) => (inner.kind === 'group' ? keysOf(inner) : []));
    return [...new Set([...marks, ...keys])];
  };
}

function keysOf(group: GroupField): string[] {
  return group.fields.map((field) => field.key);
}

/** Faults that no control below a path would show, so the group at the path does. */
function homeless(context: FormContext, path: Path): Fault[] {
  return context.faults.filter(
    (fault) => pathText(homeOf(context, fault)) === pathText(path) && fault.path.length >= 0,
  );
}

/** The setting a fault is shown with: itself, or the nearest part around it that the form has. */
function homeOf(context: FormContext, fault: Fault): Path {
  for (let length = fault.path.length; length > 0; length--) {
    const path = fault.path.slice(0, length);
    if (fieldAt(context.root, path, context.draft.raw) !== null) return path;
  }
  return [];
}

function faultLines(context: FormContext, path: Path): TemplateResult | typeof nothing {
  const faults = homeless(context, path);
  if (faults.length === 0) return nothing;
  return html`<div class="wrong" id=${`${controlId(path)}-wrong`}>
    ${faults.map((fault) => html`<p>${fault.problem}; ${fault.remedy}.</p>`)}
  </div>`;
}

function isWrong(context: FormContext, path: Path): boolean {
  return homeless(context, path).length > 0;
}

function isAt(context: FormContext, path: Path): boolean {
  return context.at !== null && pathText(context.at) === pathText(path);
}

/** The sentence of a field and the range the literature uses. */
function saying(field: Field, path: Path): TemplateResult | typeof nothing {
  if (field.sentence === '') return nothing;
  return html`<p class="says" id=${`${controlId(path)}-says`}>
    ${field.sentence}${
      field.usual === null
        ? nothing
        : html` <span class="usual"><span class="usual-word">usual</span> ${field.usual}</span>`
    }
  </p>`;
}

function described(context: FormContext, field: Field, path: Path): string {
  const id = controlId(path);
  return [field.sentence === '' ? '' : `${id}-says`, isWrong(context, path) ? `${id}-wrong` : ''].join(' ').trim();
}

/** A row: title, control, sentence, and what is wrong. */
function row(
  context: FormContext,
  field: Field,
  path: Path,
  control: TemplateResult,
  extra: unknown = nothing,
): TemplateResult {
  const classes = `setting${isAt(context, path) ? ' at' : ''}${isWrong(context, path) ? ' has-wrong' : ''}`;
  return html`<div class=${classes} data-path=${pathText(path)}>
    <label for=${controlId(path)}>${field.title}</label>
    <div class="control">${control}</div>
    <div class="about">${saying(field, path)}${extra}${faultLines(context, path)}</div>
  </div>`;
}

/** What stands in an empty control: what holds when nothing is said. */
function unsaid(context: FormContext, field: Field, path: Path): string {
  const shared = sharedValue(context, path);
  if (typeof shared === 'number' || typeof shared === 'string') return String(shared);
  const { fallback } = field;
  if (typeof fallback === 'number' || typeof fallback === 'string') return String(fallback);
  return '';
}

/** The study's own value of a setting that an arm or a group overrides. */
function sharedValue(context: FormContext, path: Path): unknown {
  const own = path[0] === 'arms' ? 2 : path[0] === 'population' && path[1] === 'groups' ? 3 : 0;
  if (own === 0 || path.length <= own + 1) return undefined;
  const section = String(path[own]);
  if (!['technology', 'shock', 'preferences', 'reference'].includes(section)) return undefined;
  return draftValue(context.draft, path.slice(own)) ?? sharedFallback(context, path.slice(own));
}

function sharedFallback(context: FormContext, path: Path): unknown {
  return fieldAt(context.root, path, context.draft.raw)?.fallback;
}

function textOf(value: unknown): string {
  if (value === undefined || value === null) return '';
  if (Array.isArray(value)) return value.map(textOf).join(', ');
  return typeof value === 'object' ? '…' : String(value);
}

/** A number as typed, or the text itself: the schema says what is wrong with it. */
export function typedNumber(text: string): Value {
  const trimmed = text.trim();
  return /^[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i.test(trimmed) ? Number(trimmed) : trimmed;
}

/** Numbers between commas or blanks. */
function typedList(text: string): Value[] {
  return text
    .split(/[\s,;]+/)
    .filter((part) => part !== '')
    .map(typedNumber);
}

/** The text of a control: as typed while it means the value, else the value's own. */
function shownText(context: FormContext, path: Path, value: unknown, meaning: (text: string) => unknown): string {
  const { active } = context;
  if (active instanceof HTMLInputElement && active.id === controlId(path)) {
    const means = meaning(active.value);
    if (JSON.stringify(means) === JSON.stringify(value) || (active.value.trim() === '' && value === undefined)) {
      return active.value;
    }
  }
  return textOf(value);
}

function change(context: FormContext, path: Path, value: Value | null): void {
  const empty = value === null || value === '' || (Array.isArray(value) && value.length === 0);
  context.edit((text) => (empty ? removeValue(text, path) : setValue(text, path, value, context.order)));
}

function input(context: FormContext, field: Field, path: Path, label?: string): TemplateResult {
  const value = draftValue(context.draft, path);
  const meaning =
    field.kind === 'number' ? typedNumber : field.kind === 'list' ? typedList : (text: string): Value => text;
  const list = field.kind === 'text' && field.isFile && context.files.length > 0 ? 'sheet-files' : undefined;
  return html`<input
    id=${controlId(path)}
    class=${field.kind === 'number' ? 'number' : 'text'}
    type="text"
    inputmode=${field.kind === 'number' ? 'decimal' : 'text'}
    autocomplete="off"
    spellcheck="false"
    list=${list ?? nothing}
    aria-label=${label ?? nothing}
    aria-invalid=${isWrong(context, path) ? 'true' : 'false'}
    aria-describedby=${described(context, field, path) || nothing}
    placeholder=${unsaid(context, field, path)}
    title=${field.kind === 'number' ? rangeWords(field) : nothing}
    ?disabled=${!context.draft.readable}
    .value=${live(shownText(context, path, value, meaning))}
    @input=${(event: Event) => change(context, path, meaning((event.target as HTMLInputElement).value))}
  />`;
}

function choice(
  context: FormContext,
  field: Field,
  path: Path,
  options: readonly { readonly value: string; readonly word: string }[],
  chosen: string | null,
  choose: (value: string) => void,
  label?: string,
  none: string | null = null,
): TemplateResult {
  return html`<select
    id=${controlId(path)}
    class="quiet"
    aria-label=${label ?? nothing}
    aria-invalid=${isWrong(context, path) ? 'true' : 'false'}
    aria-describedby=${described(context, field, path) || nothing}
    ?disabled=${!context.draft.readable}
    .value=${live(chosen ?? '')}
    @change=${(event: Event) => choose((event.target as HTMLSelectElement).value)}
  >
    ${none === null && chosen !== null ? nothing : html`<option value="" ?selected=${chosen === null}>${none ?? '–'}</option>`}
    ${options.map(({ value, word }) => html`<option value=${value} ?selected=${value === chosen}>${word}</option>`)}
  </select>`;
}

function choiceControl(context: FormContext, field: ChoiceField, path: Path, label?: string): TemplateResult {
  const value = draftValue(context.draft, path);
  const known = typeof value === 'string' && field.values.includes(value) ? value : null;
  const unsaidWord = unsaid(context, field, path);
  const group = fieldAt(context.root, path.slice(0, -1), context.draft.raw);
  const choose = (chosen: string): void => {
    context.edit((text) => {
      if (chosen === '') return removeValue(text, path);
      const out = setValue(text, path, chosen, context.order);
      const key = String(path.at(-1));
      const values = { ...((draftValue(context.draft, path.slice(0, -1)) ?? {}) as object), [key]: chosen };
      return group === null ? out : follow(out, path.slice(0, -1), groupOf(group, values), key, values, context.order);
    });
  };
  const none = field.optional
    ? unsaidWord === ''
      ? 'as in the study'
      : `${choiceWord(unsaidWord)} (unless said)`
    : null;
  return choice(
    context,
    field,
    path,
    field.values.map((word) => ({ value: word, word: choiceWord(word) })),
    known,
    choose,
    label,
    none,
  );
}

/** One of the names that something else of the study gives. */
function named(context: FormContext, field: Field, path: Path, words: readonly string[]): TemplateResult {
  const value = draftValue(context.draft, path);
  return choice(
    context,
    field,
    path,
    words.map((word) => ({ value: word, word })),
    typeof value === 'string' && words.includes(value) ? value : null,
    (chosen) => change(context, path, chosen),
    undefined,
    field.optional ? 'unless said' : null,
  );
}

/** The group a value takes, alternatives resolved. */
function groupOf(field: Field, value: unknown): GroupField {
  if (field.kind === 'group') return field;
  if (field.kind === 'union') {
    const variant = variantAt(field, value);
    if (variant?.field.kind === 'group') return variant.field;
  }
  throw new Error(`${field.key} holds no settings`);
}

function flag(context: FormContext, field: Field, path: Path): TemplateResult {
  const value = draftValue(context.draft, path) ?? field.fallback;
  return html`<input
    id=${controlId(path)}
    type="checkbox"
    aria-describedby=${described(context, field, path) || nothing}
    ?disabled=${!context.draft.readable}
    .checked=${live(value === true)}
    @change=${(event: Event) => {
      const on = (event.target as HTMLInputElement).checked;
      context.edit((text) =>
        on === field.fallback ? removeValue(text, path) : setValue(text, path, on, context.order),
      );
    }}
  />`;
}

/** Several of a few words. */
function several(context: FormContext, field: ListField, path: Path): TemplateResult {
  const { item } = field;
  const words = item.kind === 'choice' ? item.values : [];
  const value = draftValue(context.draft, path) ?? field.fallback;
  const chosen = Array.isArray(value) ? value.map(String) : [];
  return html`<span class="several" role="group" aria-label=${field.title} id=${controlId(path)}>
    ${words.map(
      (word) => html`<label class="tick"><input
        type="checkbox"
        ?disabled=${!context.draft.readable}
        .checked=${live(chosen.includes(word))}
        @change=${(event: Event) => {
          const on = (event.target as HTMLInputElement).checked;
          const next = words.filter((one) => (one === word ? on : chosen.includes(one)));
          context.edit((text) => setValue(text, path, next, context.order));
        }}
      />${word}</label>`,
    )}
  </span>`;
}

/** A button that adds or removes. */
function act(label: string, says: string, go: () => void, disabled = false): TemplateResult {
  return html`<button type="button" class="plain act" aria-label=${says} ?disabled=${disabled} @click=${go}>${label}</button>`;
}

/**
 * One setting, or a group of them with everything below.
 *
 * @param path - where it stands in the study
 */
export function fieldTemplate(context: FormContext, field: Field, path: Path, depth = 0): TemplateResult {
  switch (field.kind) {
    case 'text': {
      const words = context.words(path);
      if (words === null) return row(context, field, path, input(context, field, path));
      return row(context, field, path, named(context, field, path, words));
    }
    case 'number':
      return row(context, field, path, input(context, field, path), otherWay(context, path));
    case 'choice':
      return row(context, field, path, choiceControl(context, field, path));
    case 'flag':
      return row(context, field, path, flag(context, field, path));
    case 'union':
      return unionTemplate(context, field, path, depth);
    case 'group':
      return groupTemplate(context, field, path, depth);
    case 'list':
      return listTemplate(context, field, path, depth);
  }
}

function otherWay(context: FormContext, path: Path): unknown {
  const other = context.other(path);
  if (other === null) return nothing;
  return html`<button type="button" class="plain inline" @click=${() => context.edit((text) => other.edit(text))}>${other.label}</button>`;
}

/** The settings of a group that belong to it as it stands. */
export function fieldsTemplate(
  context: FormContext,
  fields: readonly Field[],
  path: Path,
  depth: number,
): TemplateResult[] {
  const values = draftValue(context.draft, path);
  const siblings = values !== null && typeof values === 'object' ? (values as Record<string, unknown>) : {};
  const shared = (sharedValue(context, [...path, '']) ?? sharedGroup(context, path)) as Record<string, unknown>;
  return fields
    .filter((field) => belongs(field.key, siblings, shared))
    .map((field) => fieldTemplate(context, field, [...path, field.key], depth));
}

function sharedGroup(context: FormContext, path: Path): Record<string, unknown> {
  const own = path[0] === 'arms' ? 2 : path[0] === 'population' && path[1] === 'groups' ? 3 : 0;
  if (own === 0 || path.length <= own) return {};
  const value = draftValue(context.draft, path.slice(own));
  return value !== null && typeof value === 'object' ? (value as Record<string, unknown>) : {};
}

function unionTemplate(context: FormContext, field: UnionField, path: Path, depth: number): TemplateResult {
  const said = draftValue(context.draft, path);
  const value = said ?? field.fallback;
  const variant = variantAt(field, value);
  const words = variant === null ? null : alternative(field.key, variant.name);
  const optional = field.optional && field.fallback === undefined;
  const control = choice(
    context,
    field,
    path,
    field.variants.map(({ name }) => ({ value: name, word: alternative(field.key, name).name })),
    variant?.name ?? null,
    (name) => {
      const to = field.variants.find((one) => one.name === name);
      context.edit((text) =>
        to === undefined ? removeValue(text, path) : turn(text, path, field, to, context.draft.raw, context.order),
      );
    },
    undefined,
    optional ? (LEFT_OUT[field.key] ?? 'none') : null,
  );
  const inner = variant?.field;
  return html`<div class="union">
    ${row(context, field, path, control, words === null || words.says === '' ? nothing : html`<p class="says variant">${words.says}</p>`)}
    ${
      inner === undefined || said === undefined
        ? nothing
        : inner.kind === 'group'
          ? html`<div class="inner">${fieldsTemplate(context, inner.fields, path, depth + 1)}</div>`
          : inner.kind === 'number' || inner.kind === 'text'
            ? html`<div class="inner">${scalarOf(context, field, path)}</div>`
            : nothing
    }
  </div>`;
}

/** The value of a union's plain variant, whose choice already has the path's own identifier. */
function scalarOf(context: FormContext, union: UnionField, path: Path): TemplateResult {
  const value = draftValue(context.draft, path);
  const id = `${controlId(path)}-value`;
  return html`<div class="setting">
    <label for=${id}>Number</label>
    <div class="control"><input
      id=${id}
      class="number"
      type="text"
      inputmode="decimal"
      autocomplete="off"
      aria-describedby=${described(context, union, path) || nothing}
      ?disabled=${!context.draft.readable}
      .value=${live(context.active?.id === id && typedNumber((context.active as HTMLInputElement).value) === value ? (context.active as HTMLInputElement).value : textOf(value))}
      @input=${(event: Event) => change(context, path, typedNumber((event.target as HTMLInputElement).value) || 0)}
    /></div>
    <div class="about"></div>
  </div>`;
}

function groupTemplate(context: FormContext, field: GroupField, path: Path, depth: number): TemplateResult {
  const present = draftValue(context.draft, path) !== undefined;
  const adds = field.optional && field.fallback === undefined;
  if (adds && !present) {
    return html`<div class="setting adds" data-path=${pathText(path)}>
      <span class="label">${field.title}</span>
      <div class="control">${act('add', `Add ${field.title.toLowerCase()}`, () => addGroup(context, field, path), !context.draft.readable)}</div>
      <div class="about">${saying(field, path)}${faultLines(context, path)}</div>
    </div>`;
  }
  return html`<fieldset class=${`group depth-${Math.min(depth, 3)}${isAt(context, path) ? ' at' : ''}`} data-path=${pathText(path)}>
    <legend>${field.title}</legend>
    ${adds ? act('remove', `Remove ${field.title.toLowerCase()}`, () => context.edit((text) => removeValue(text, path)), !context.draft.readable) : nothing}
    ${saying(field, path)}${faultLines(context, path)}
    ${fieldsTemplate(context, field.fields, path, depth + 1)}
  </fieldset>`;
}

function addGroup(context: FormContext, field: GroupField, path: Path): void {
  const own = begun(field) as Record<string, Value>;
  const first = field.fields[0]!;
  // an override starts from what it overrides, at its first setting
  const shared = sharedValue(context, [...path, first.key]);
  const start =
    Object.keys(own).length > 0
      ? own
      : { [first.key]: typeof shared === 'number' || typeof shared === 'string' ? shared : begun(first) };
  const values = start as Record<string, Value>;
  context.edit(
    (text) => {
      const out = setValue(text, path, values, context.order);
      return first.kind === 'choice' ? follow(out, path, field, first.key, values, context.order) : out;
    },
    [...path, first.key],
  );
}

// ── lists ───────────────────────────────────────────────────────────────────────────────────────

function listTemplate(context: FormContext, field: ListField, path: Path, depth: number): TemplateResult {
  const { item } = field;
  if (item.kind === 'choice') return row(context, field, path, several(context, field, path));
  if (item.kind !== 'group') return row(context, field, path, input(context, field, path));
  const flat = item.fields.every((inner) => inner.kind !== 'list' && inner.kind !== 'union');
  return flat ? tableTemplate(context, field, item, path, depth) : cardsTemplate(context, field, item, path, depth);
}

function entriesOf(context: FormContext, path: Path): readonly unknown[] {
  const value = draftValue(context.draft, path);
  return Array.isArray(value) ? value : [];
}

function addEntry(context: FormContext, field: ListField, path: Path): TemplateResult {
  const entries = entriesOf(context, path);
  const word = ENTRY[field.key] ?? 'entry';
  return act(
    `add ${article(word)} ${word}`,
    `Add ${article(word)} ${word}`,
    () => {
      const value = begunEntry(field, entries);
      const first = field.item.kind === 'group' ? field.item.fields[0]! : null;
      const then = first === null ? path : [...path, entries.length, first.key];
      context.edit((text) => insertItem(text, path, entries.length, value, context.order), then);
    },
    entries.length >= field.atMost || !context.draft.readable,
  );
}

function article(word: string): string {
  return /^[aeiou]/.test(word) ? 'an' : 'a';
}

/** A new entry, named so that it differs from those there. */
function begunEntry(field: ListField, entries: readonly unknown[]): Value {
  const value = begun(field.item);
  if (value === null || typeof value !== 'object' || Array.isArray(value)) return value;
  const names = entries
    .map((entry) => (entry as Record<string, unknown> | null)?.name)
    .filter((name) => typeof name === 'string');
  const named = value as Record<string, Value>;
  if ('name' in named) {
    const word = ENTRY[field.key] ?? 'entry';
    let k = entries.length + 1;
    while (names.includes(`${word} ${k}`)) k++;
    const own = { ...named, name: `${word} ${k}` };
    if (field.key === 'groups') return { ...own, share: entries.length === 0 ? 1 : 0 };
    // a further arm starts as a half-mixed copy of the first
    if (field.key === 'arms' && names.length > 0) {
      return { ...own, network: { from: names[0] as string, mixing: { share: 0.5 } } };
    }
    return own;
  }
  if (field.key === 'mix' && entries.length === 0) return { ...named, weight: 1 };
  if (field.key === 'milestones') return { weight: 0.5, mix: [{ from: 'self', weight: 1 }] };
  return named;
}

function removeEntry(context: FormContext, field: ListField, path: Path, index: number, says: string): TemplateResult {
  const entries = entriesOf(context, path);
  const last = entries.length <= field.atLeast;
  const all = entries.length === 1 && field.optional;
  return act(
    'remove',
    says,
    () => context.edit((text) => removeValue(text, all ? path : [...path, index])),
    (last && !all) || !context.draft.readable,
  );
}

/** Entries with a few plain settings each: a table, and below it what its columns mean. */
function tableTemplate(
  context: FormContext,
  field: ListField,
  item: GroupField,
  path: Path,
  depth: number,
): TemplateResult {
  const entries = entriesOf(context, path);
  const plain = item.fields.filter((inner) => inner.kind !== 'group');
  const nested = item.fields.filter((inner): inner is GroupField => inner.kind === 'group');
  // a column that no entry can use is left out
  const columns = plain.filter((inner) =>
    entries.some(
      (entry) => entry !== null && typeof entry === 'object' && belongs(inner.key, entry as Record<string, unknown>),
    ),
  );
  const word = ENTRY[field.key] ?? 'entry';
  const nameOf = (entry: unknown, i: number): string => {
    const name = (entry as Record<string, unknown> | null)?.name;
    return typeof name === 'string' ? `${word} ${name}` : `${word} ${i + 1}`;
  };
  const cell = (inner: Field, entry: unknown, i: number): TemplateResult | typeof nothing => {
    const at = [...path, i, inner.key];
    const siblings = entry !== null && typeof entry === 'object' ? (entry as Record<string, unknown>) : {};
    if (!belongs(inner.key, siblings)) return nothing;
    const label = `${inner.title} of ${nameOf(entry, i)}`;
    return inner.kind === 'choice'
      ? choiceControl(context, inner, at, label)
      : input(context, { ...inner, sentence: '' } as Field, at, label);
  };
  return html`<fieldset class=${`group listing depth-${Math.min(depth, 3)}${isAt(context, path) ? ' at' : ''}`} data-path=${pathText(path)}>
    <legend>${field.title}</legend>
    ${saying(field, path)}${faultLines(context, path)}
    ${
      entries.length === 0
        ? nothing
        : html`<table class="entries">
            <thead><tr>
              ${columns.map((inner) => html`<th scope="col">${inner.title}</th>`)}
              <td></td>
            </tr></thead>
            <tbody>
              ${entries.map((entry, i) => {
                const at = [...path, i];
                const wrong = [
                  ...homeless(context, at),
                  ...columns.flatMap((inner) => homeless(context, [...at, inner.key])),
                ];
                const marked = context.at !== null && pathText(context.at).startsWith(pathText(at));
                return html`<tr class=${marked ? 'at' : ''} data-path=${pathText(at)}>
                    ${columns.map((inner) => html`<td>${cell(inner, entry, i)}</td>`)}
                    <td class="last">
                      ${nested.map((inner) =>
                        draftValue(context.draft, [...at, inner.key]) === undefined
                          ? act(
                              inner.title.toLowerCase(),
                              `Give ${nameOf(entry, i)} its ${inner.title.toLowerCase()}`,
                              () => addGroup(context, inner, [...at, inner.key]),
                              !context.draft.readable,
                            )
                          : nothing,
                      )}
                      ${removeEntry(context, field, path, i, `Remove ${nameOf(entry, i)}`)}
                    </td>
                  </tr>
                  ${
                    wrong.length === 0
                      ? nothing
                      : html`<tr class="wrong-row"><td colspan=${columns.length + 1}><div class="wrong" id=${`${controlId(at)}-wrong`}>
                          ${wrong.map((fault) => html`<p>${fault.problem}; ${fault.remedy}.</p>`)}
                        </div></td></tr>`
                  }
                  ${nested
                    .filter((inner) => draftValue(context.draft, [...at, inner.key]) !== undefined)
                    .map(
                      (inner) =>
                        html`<tr class="nested"><td colspan=${columns.length + 1}>${groupTemplate(
                          context,
                          { ...inner, title: `${inner.title}: ${nameOf(entry, i)}` },
                          [...at, inner.key],
                          depth + 1,
                        )}</td></tr>`,
                    )}`;
              })}
            </tbody>
          </table>`
    }
    <p class="adder">${addEntry(context, field, path)}</p>
    ${
      entries.length === 0
        ? nothing
        : html`<dl class="meanings">
            ${[...columns, ...nested].map(
              (inner) =>
                html`<div><dt>${inner.title}</dt><dd>${inner.sentence}${
                  inner.usual === null
                    ? nothing
                    : html` <span class="usual"><span class="usual-word">usual</span> ${inner.usual}</span>`
                }</dd></div>`,
            )}
          </dl>`
    }
  </fieldset>`;
}

/** Entries with parts of their own: a card each. */
function cardsTemplate(
  context: FormContext,
  field: ListField,
  item: GroupField,
  path: Path,
  depth: number,
): TemplateResult {
  const entries = entriesOf(context, path);
  const word = ENTRY[field.key] ?? 'entry';
  return html`<div class="cards" data-path=${pathText(path)}>
    ${saying(field, path)}${faultLines(context, path)}
    ${entries.map((entry, i) => {
      const at = [...path, i];
      const name = (entry as Record<string, unknown> | null)?.name;
      const title = typeof name === 'string' ? `${spokenWord(word)} ${name}` : `${spokenWord(word)} ${i + 1}`;
      return html`<fieldset class=${`card depth-${Math.min(depth, 3)}${isAt(context, at) ? ' at' : ''}`} data-path=${pathText(at)}>
        <legend>${title}</legend>
        ${removeEntry(context, field, path, i, `Remove ${title}`)}
        ${faultLines(context, at)}
        ${fieldsTemplate(context, item.fields, at, depth + 1)}
      </fieldset>`;
    })}
    <p class="adder">${addEntry(context, field, path)}</p>
  </div>`;
}

function spokenWord(word: string): string {
  return word.charAt(0).toUpperCase() + word.slice(1);
}
