/**
 * What the reader is looking at: everything a link restores, and nothing else.
 */

import type { Arrangement } from '../field/arrangement.js';
import { COLOURINGS, type Colouring } from '../field/colouring.js';

export const TABS = ['household', 'pockets', 'distribution', 'contrasts', 'estimates'] as const;
export type Tab = (typeof TABS)[number];

export interface View {
  readonly replicate: number;
  readonly generation: number;
  /** Arm shown in the left and in the right field, by index. */
  readonly left: number;
  readonly right: number;
  readonly arrangement: Arrangement;
  readonly colouring: Colouring;
  readonly ties: boolean;
  /** Household number as in the files, or null. */
  readonly household: number | null;
  /** Pocket picked from the table: field and id, or null. */
  readonly pocket: { readonly field: 0 | 1; readonly id: number } | null;
  readonly tab: Tab;
}

export const START: View = {
  replicate: 0,
  generation: 0,
  left: 0,
  right: 1,
  arrangement: 'ladder',
  colouring: 'status',
  ties: false,
  household: null,
  pocket: null,
  tab: 'household',
};

/** The view as the part of a link after `#`; only what differs from the start. */
export function toLink(view: View): string {
  const q = new URLSearchParams();
  if (view.replicate !== START.replicate) q.set('replicate', String(view.replicate));
  q.set('generation', String(view.generation));
  if (view.left !== 0 || view.right !== 1) q.set('arms', `${view.left},${view.right}`);
  if (view.arrangement !== START.arrangement) q.set('arrangement', view.arrangement);
  if (view.colouring !== START.colouring) q.set('colour', view.colouring.replaceAll(' ', '-'));
  if (view.ties) q.set('ties', 'shown');
  if (view.household !== null) q.set('household', String(view.household));
  if (view.tab !== START.tab) q.set('tab', view.tab);
  return q.toString();
}

/**
 * Reads a link over a view. What it does not name, or names wrongly, stays as it was.
 *
 * @param link - with or without `#`
 */
export function fromLink(link: string, view: View): View {
  const q = new URLSearchParams(link.replace(/^#/, ''));
  const whole = (name: string): number | null => {
    const v = q.get(name);
    return v !== null && /^\d{1,9}$/.test(v) ? Number(v) : null;
  };
  const arms = /^(\d+),(\d+)$/.exec(q.get('arms') ?? '');
  const colour = (q.get('colour') ?? '').replaceAll('-', ' ');
  const tab = q.get('tab') ?? '';
  const arrangement = q.get('arrangement');
  return {
    replicate: whole('replicate') ?? view.replicate,
    generation: whole('generation') ?? view.generation,
    left: arms === null ? view.left : Number(arms[1]),
    right: arms === null ? view.right : Number(arms[2]),
    arrangement: arrangement === 'map' || arrangement === 'ladder' ? arrangement : view.arrangement,
    colouring: COLOURINGS.find((c) => c === colour) ?? view.colouring,
    ties: q.has('ties') ? q.get('ties') === 'shown' : view.ties,
    household: q.has('household') ? whole('household') : view.household,
    pocket: view.pocket,
    tab: TABS.find((t) => t === tab) ?? view.tab,
  };
}
