/**
 * The study schema as a tree of fields a form can show: titles, sentences, ranges, alternatives.
 *
 * Reads the one definition (sim/study/schema.ts); holds no wording of its own, no DOM and no values. Which of
 * several alternatives holds is told by the study's own values (`variantAt`).
 */
import type { z } from 'zod';

/** What every field has, whatever it holds. */
interface FieldHead {
  /** Key in the study file, or '' for an entry of a list. */
  readonly key: string;
  readonly title: string;
  /** One sentence on what it means. */
  readonly sentence: string;
  /** The literature's usual range, or null. */
  readonly usual: string | null;
  /** May be left out, because it is optional or has a default. */
  readonly optional: boolean;
  /** What holds when it is left out, or undefined. */
  readonly fallback: unknown;
}

export interface NumberField extends FieldHead {
  readonly kind: 'number';
  readonly whole: boolean;
  readonly least: number | null;
  readonly most: number | null;
  /** The bound itself is not allowed. */
  readonly aboveLeast: boolean;
  readonly belowMost: boolean;
}

export interface TextField extends FieldHead {
  readonly kind: 'text';
  /** A file's path, relative to the study. */
  readonly isFile: boolean;
}

export interface FlagField extends FieldHead {
  readonly kind: 'flag';
}

export interface ChoiceField extends FieldHead {
  readonly kind: 'choice';
  readonly values: readonly string[];
}

export interface ListField extends FieldHead {
  readonly kind: 'list';
  readonly item: Field;
  readonly atLeast: number;
  readonly atMost: number;
}

export interface GroupField extends FieldHead {
  readonly kind: 'group';
  readonly fields: readonly Field[];
}

export interface UnionField extends FieldHead {
  readonly kind: 'union';
  readonly variants: readonly Variant[];
}

/** One of several shapes a value may take. */
export interface Variant {
  /** Stable name: the value of the deciding key, the deciding key, a single word, or `number`. */
  readonly name: string;
  /** The key and word that mark it (`kind: blocks`), or null. */
  readonly mark: { readonly key: string; readonly word: string } | null;
  /** What it holds; a group leaves out the marking key. */
  readonly field: Field;
}

export type Field = NumberField | TextField | FlagField | ChoiceField | ListField | GroupField | UnionField;

// zod keeps a schema's structure in `_zod.def`; these are the kinds the study schema uses
interface Definition {
  readonly type: string;
  readonly innerType?: z.ZodType;
  readonly element?: z.ZodType;
  readonly options?: readonly z.ZodType[];
  readonly discriminator?: string;
  readonly shape?: Readonly<Record<string, z.ZodType>>;
  readonly values?: readonly unknown[];
  readonly entries?: Readonly<Record<string, string>>;
  readonly defaultValue?: unknown;
  readonly format?: string;
  readonly checks?: readonly { readonly _zod: { readonly def: Check } }[];
}

interface Check {
  readonly check: string;
  readonly value?: number;
  readonly inclusive?: boolean;
  readonly minimum?: number;
  readonly maximum?: number;
}

function definition(schema: z.ZodType): Definition {
  return schema._zod.def as unknown as Definition;
}

/**
 * The field a schema describes, with everything below it.
 *
 * @param schema - of the kinds the study schema uses
 * @param key - its key in the file
 * @throws Error for a kind of schema no form knows (a bug: teach this file the kind)
 */
export function fieldOf(schema: z.ZodType, key = ''): Field {
  let at = schema;
  let title: string | undefined;
  let sentence: string | undefined;
  let usual: string | null = null;
  let optional = false;
  let fallback: unknown;
  for (;;) {
    const note = at.meta() as { title?: string; description?: string; usual?: string } | undefined;
    title ??= note?.title;
    sentence ??= note?.description;
    usual ??= note?.usual ?? null;
    const def = definition(at);
    if (def.innerType === undefined) break;
    if (def.type === 'default' || def.type === 'prefault') {
      optional = true;
      fallback = def.defaultValue;
    } else if (def.type === 'optional') optional = true;
    at = def.innerType;
  }
  const head: FieldHead = { key, title: title ?? spoken(key), sentence: sentence ?? '', usual, optional, fallback };
  const def = definition(at);
  switch (def.type) {
    case 'number':
      return { ...head, kind: 'number', ...bounds(def) };
    case 'string':
      return { ...head, kind: 'text', isFile: key === 'path' || key === 'file' || key.endsWith('_file') };
    case 'boolean':
      return { ...head, kind: 'flag' };
    case 'enum':
      return { ...head, kind: 'choice', values: Object.values(def.entries ?? {}) };
    case 'array': {
      const { least, most } = lengths(def);
      return { ...head, kind: 'list', item: fieldOf(def.element!), atLeast: least, atMost: most };
    }
    case 'object':
      return {
        ...head,
        kind: 'group',
        // a key with one allowed word marks a variant and is no field of its own
        fields: Object.entries(def.shape ?? {})
          .filter(([, inner]) => definition(inner).type !== 'literal' && inner.meta()?.textOnly !== true)
          .map(([name, inner]) => fieldOf(inner, name)),
      };
    case 'union': {
      const variants = (def.options ?? []).flatMap((option) => variantsOf(option, key));
      // text that may look like a number is one field, not two
      if (variants.every(({ field }) => field.kind === 'text' || field.kind === 'number')) {
        return { ...head, kind: 'text', isFile: false };
      }
      return { ...head, kind: 'union', variants: told(variants) };
    }
    default:
      throw new Error(`the study sheet has no field for a schema of type ${def.type} at '${key}'`);
  }
}

function spoken(key: string): string {
  const text = key.replaceAll('_', ' ');
  return text.charAt(0).toUpperCase() + text.slice(1);
}

function bounds(def: Definition): Pick<NumberField, 'whole' | 'least' | 'most' | 'aboveLeast' | 'belowMost'> {
  let least: number | null = null;
  let most: number | null = null;
  let aboveLeast = false;
  let belowMost = false;
  for (const { _zod } of def.checks ?? []) {
    const { check, value, inclusive } = _zod.def;
    if (check === 'greater_than') {
      least = value ?? null;
      aboveLeast = inclusive === false;
    } else if (check === 'less_than') {
      most = value ?? null;
      belowMost = inclusive === false;
    }
  }
  const whole = def.format === 'safeint' || (def.checks ?? []).some(({ _zod }) => _zod.def.check === 'number_format');
  return { whole, least, most, aboveLeast, belowMost };
}

function lengths(def: Definition): { least: number; most: number } {
  let least = 0;
  let most = Infinity;
  for (const { _zod } of def.checks ?? []) {
    const { check, minimum, maximum } = _zod.def;
    if (check === 'min_length') least = minimum ?? 0;
    if (check === 'max_length') most = maximum ?? Infinity;
  }
  return { least, most };
}

function variantsOf(option: z.ZodType, key: string): Variant[] {
  const def = definition(option);
  if (def.type === 'union') return (def.options ?? []).flatMap((inner) => variantsOf(inner, key));
  const field = fieldOf(option, key);
  if (field.kind === 'choice') {
    return field.values.map((word) => ({ name: word, mark: null, field: { ...field, values: [word] } }));
  }
  if (def.type !== 'object') return [{ name: field.kind, mark: null, field }];
  const shape = def.shape ?? {};
  for (const [name, inner] of Object.entries(shape)) {
    const literal = definition(inner);
    if (literal.type !== 'literal') continue;
    const word = String(literal.values?.[0]);
    return [{ name: word, mark: { key: name, word }, field }];
  }
  return [{ name: 'object', mark: null, field }];
}

/** Names the unmarked groups of a union by the first key that the others do not have. */
function told(variants: readonly Variant[]): Variant[] {
  const keys = variants.map(({ field }) => (field.kind === 'group' ? field.fields.map((inner) => inner.key) : []));
  return variants.map((variant, v) => {
    if (variant.name !== 'object') return variant;
    const own = keys[v]!.find((key) => keys.every((other, w) => w === v || !other.includes(key)));
    return { ...variant, name: own ?? 'object' };
  });
}

/**
 * The variant a value takes: by its mark, by its kind of value, or by the key only that variant has; null when
 * nothing tells.
 */
export function variantAt(union: UnionField, value: unknown): Variant | null {
  const group = value !== null && typeof value === 'object' && !Array.isArray(value);
  for (const variant of union.variants) {
    const { field, mark } = variant;
    if (mark !== null) {
      if (group && (value as Record<string, unknown>)[mark.key] === mark.word) return variant;
    } else if (field.kind === 'choice') {
      if (field.values[0] === value) return variant;
    } else if (field.kind === 'number') {
      if (typeof value === 'number') return variant;
    } else if (field.kind === 'group' && group) {
      const unmarked = union.variants.filter((other) => other.mark === null && other.field.kind === 'group');
      if (unmarked.length === 1 && !('kind' in value)) return variant;
      if (variant.name in value) return variant;
    }
  }
  return null;
}

/** The field at a path of a study, alternatives resolved by the study's own values; null where there is none. */
export function fieldAt(root: Field, path: readonly (string | number)[], study: unknown): Field | null {
  let field: Field = root;
  let value = study;
  for (const step of path) {
    if (field.kind === 'union') {
      const variant = variantAt(field, value);
      if (variant === null) return null;
      field = variant.field;
    }
    if (field.kind === 'list') field = field.item;
    else if (field.kind === 'group') {
      const inner = field.fields.find((candidate) => candidate.key === step);
      if (inner === undefined) return null;
      field = inner;
    } else return null;
    value = value !== null && typeof value === 'object' ? (value as Record<string | number, unknown>)[step] : undefined;
  }
  return field;
}

/** The allowed numbers in words: `0 to 1`, `above 0`, `a whole number, at least 2`. */
export function rangeWords(field: NumberField): string {
  const { least, most, aboveLeast, belowMost, whole } = field;
  const parts: string[] = [];
  if (least !== null && most !== null && !aboveLeast && !belowMost) parts.push(`${least} to ${most}`);
  else {
    if (least !== null) parts.push(`${aboveLeast ? 'above' : 'at least'} ${least}`);
    if (most !== null) parts.push(`${belowMost ? 'below' : 'at most'} ${most}`);
  }
  const range = parts.join(', ');
  if (!whole) return range === '' ? 'any number' : range;
  return range === '' ? 'a whole number' : `whole, ${range}`;
}
