/**
 * Which settings go together: what the form leaves out because another setting rules it out, and what has to change
 * with a choice so that the study stays whole.
 *
 * The checks themselves are sim/study/check.ts; this keeps the form from leading into them.
 */

import { type KeyOrder, type Path, removeValue, setValue, type Value, valueAt } from './edit.js';
import type { Field, GroupField, UnionField, Variant } from './fields.js';
import { starter } from './words.js';

type Values = Readonly<Record<string, unknown>>;

const WEALTH_KEYS: Readonly<Record<string, readonly string[]>> = {
  lognormal: ['mean', 'gini', 'sd_log'],
  pareto_tail: ['mean', 'gini', 'sd_log', 'pareto_tail'],
  quantile_shares: ['mean', 'quantile_shares'],
  sample: ['sample', 'mean'],
};

const TECHNOLOGY_KEYS: Readonly<Record<string, readonly string[]>> = {
  linear: ['gross_return'],
  concave: ['scale', 'elasticity', 'depreciation'],
};

/**
 * Whether a setting belongs to its group as the group stands. One that is written down is always shown.
 *
 * @param shared - what the study says where an arm or a group overrides it, else empty
 */
export function belongs(key: string, siblings: Values, shared: Values = {}): boolean {
  if (siblings[key] !== undefined) return true;
  const said = (name: string): unknown => siblings[name] ?? shared[name];
  switch (key) {
    case 'milestone_curvature':
      return said('milestone_shape') !== 'gain-loss';
    case 'loss_aversion':
      return said('milestone_shape') === 'gain-loss';
    case 'q':
      return said('statistic') === 'quantile';
    case 'window':
      return said('statistic') === 'similarity_mean';
    default:
  }
  if ('shape' in siblings && key !== 'shape' && key !== 'between_places') {
    const takes = WEALTH_KEYS[String(siblings.shape)];
    if (takes !== undefined && !takes.includes(key)) return false;
    // one of the two says how wide the distribution is; the Gini unless the other is written down
    return key === 'gini' ? siblings.sd_log === undefined : key !== 'sd_log';
  }
  if (['gross_return', 'scale', 'elasticity', 'depreciation'].includes(key)) {
    const takes = TECHNOLOGY_KEYS[String(said('kind'))];
    return takes === undefined || takes.includes(key);
  }
  return true;
}

/** A new value for a field: what it starts from, with all it requires. */
export function begun(field: Field): Value {
  switch (field.kind) {
    case 'group':
      return Object.fromEntries(
        field.fields.filter((inner) => !inner.optional).map((inner) => [inner.key, begun(inner)]),
      );
    case 'list':
      return Array.from({ length: Math.max(1, field.atLeast) }, () => begun(field.item));
    case 'union':
      return begunVariant(field, field.variants[0]!);
    case 'flag':
      return starter(field.key) ?? true;
    case 'choice':
      return starter(field.key) !== undefined && field.values.includes(String(starter(field.key)))
        ? starter(field.key)!
        : field.values[0]!;
    default:
      return starter(field.key) ?? (field.kind === 'number' ? 1 : '');
  }
}

/** A new value of a union's variant. */
export function begunVariant(union: UnionField, variant: Variant): Value {
  if (variant.field.kind !== 'group') return begun({ ...variant.field, key: union.key });
  const own = begun(variant.field) as Readonly<Record<string, Value>>;
  const { mark } = variant;
  const whole = mark === null ? own : { [mark.key]: mark.word, ...own };
  // a variant told by an optional key starts with that key
  const told = mark === null && variant.field.fields.some((inner) => inner.key === variant.name && inner.optional);
  return told ? { ...whole, [variant.name]: starter(variant.name) ?? 1 } : whole;
}

/**
 * Turns a value into another variant: keys both have stay, keys of the old one go, what the new one needs comes.
 *
 * @returns the new text
 */
export function turn(text: string, path: Path, union: UnionField, to: Variant, raw: unknown, order: KeyOrder): string {
  const now = valueAt(raw, path);
  const fresh = begunVariant(union, to);
  const group = (value: unknown): value is Values =>
    value !== null && typeof value === 'object' && !Array.isArray(value);
  if (!group(now) || !group(fresh) || to.field.kind !== 'group') {
    let value = fresh;
    if (union.key === 'places') {
      const count = typeof now === 'number' ? now : group(now) ? now.count : undefined;
      if (typeof count === 'number') value = typeof fresh === 'number' ? count : { count, size_cv: 0.4 };
    }
    return setValue(text, path, value, order);
  }
  const keys = to.field.fields.map((inner) => inner.key);
  let out = text;
  const { mark } = to;
  // the mark first, so that the map is never left empty
  if (mark !== null) out = setValue(out, [...path, mark.key], mark.word, order);
  for (const [key, value] of Object.entries(fresh)) {
    if (key === mark?.key) continue;
    const kept = now[key];
    if (kept === undefined || !alike(kept, value)) out = setValue(out, [...path, key], value as Value, order);
  }
  for (const key of Object.keys(now)) {
    if (key !== mark?.key && !keys.includes(key)) out = removeValue(out, [...path, key]);
  }
  return out;
}

function alike(a: unknown, b: unknown): boolean {
  return typeof a === typeof b && Array.isArray(a) === Array.isArray(b);
}

/**
 * What a choice brings with it: settings that no longer belong go, those now needed come.
 *
 * @param path - of the group the choice stands in
 * @param values - of that group, the choice made
 * @returns the new text
 */
export function follow(
  text: string,
  path: Path,
  group: GroupField,
  key: string,
  values: Values,
  order: KeyOrder,
): string {
  let out = text;
  const drop = (name: string): void => {
    if (values[name] !== undefined) out = removeValue(out, [...path, name]);
  };
  const need = (name: string): void => {
    if (values[name] !== undefined) return;
    const field = group.fields.find((inner) => inner.key === name);
    if (field !== undefined) out = setValue(out, [...path, name], starter(name) ?? begun(field), order);
  };
  const chosen = String(values[key]);
  if (key === 'shape') {
    const takes = WEALTH_KEYS[chosen] ?? [];
    for (const name of new Set(Object.values(WEALTH_KEYS).flat())) if (!takes.includes(name)) drop(name);
    for (const name of takes) {
      if (name === 'sd_log' || (name === 'gini' && values.sd_log !== undefined)) continue;
      if (name === 'mean' && chosen === 'sample') continue;
      need(name);
    }
  } else if (key === 'milestone_shape') {
    drop(chosen === 'gain-loss' ? 'milestone_curvature' : 'loss_aversion');
    if (chosen === 'gain-loss') need('loss_aversion');
    else if (typeof values.curvature === 'number' && values.curvature >= 1) need('milestone_curvature');
  } else if (key === 'statistic') {
    if (chosen !== 'quantile') drop('q');
    else need('q');
    if (chosen !== 'similarity_mean') drop('window');
    else need('window');
  } else if (key === 'kind') {
    const takes = TECHNOLOGY_KEYS[chosen] ?? [];
    for (const name of Object.values(TECHNOLOGY_KEYS).flat()) if (!takes.includes(name)) drop(name);
    for (const name of takes) if (name !== 'depreciation') need(name);
  }
  return out;
}
