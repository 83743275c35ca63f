/**
 * What the colour of a mark says, and the legend that says so. The shape always says the status: a disc is
 * satisfied, an open ring is frustrated, so that status is told apart without colour.
 */
import type { Cast, Snapshot } from '../data/source.js';
import { CAUSE } from '../data/source.js';
import { mix, rgb, type Tokens } from '../screen/tokens.js';
import type { Look } from './marks.js';
import { fairStep } from './sample.js';

export const COLOURINGS = ['status', 'wealth rank', 'aspiration gap', 'growth', 'group', 'cause', 'treated'] as const;
export type Colouring = (typeof COLOURINGS)[number];

/** A line of the legend: a mark and its meaning, or a ramp with its ends. */
export type LegendItem =
  | { readonly kind: 'disc' | 'ring' | 'tint'; readonly colour: string; readonly says: string }
  | { readonly kind: 'ramp'; readonly colours: readonly string[]; readonly from: string; readonly to: string };

const STEPS = 64;

/** What a colouring needs to know besides the snapshot. */
export interface Setting {
  readonly cast: Cast;
  readonly groupNames: readonly string[];
  readonly tokens: Tokens;
}

function ramp(colours: readonly string[]): string[] {
  const out: string[] = [];
  for (let k = 0; k < STEPS; k++) {
    const at = (k / (STEPS - 1)) * (colours.length - 1);
    const low = Math.min(colours.length - 2, Math.floor(at));
    out.push(mix(colours[low], colours[low + 1], at - low));
  }
  return out;
}

/** Ranks 0 … 1 of values, ties in order of index (a drawing aid; the panel averages ties). */
function ranks(values: Float64Array): Float32Array {
  const order = Uint32Array.from(values, (_, i) => i).sort((a, b) => values[a] - values[b]);
  const out = new Float32Array(values.length);
  order.forEach((i, k) => {
    out[i] = values.length > 1 ? k / (values.length - 1) : 0.5;
  });
  return out;
}

/** Which colours there are, and which of them each household wears; both n long in the order of the cast. */
function palette(
  snapshot: Snapshot,
  colouring: Colouring,
  setting: Setting,
): { colours: readonly string[]; of: Uint8Array } {
  const { tokens, cast } = setting;
  const n = cast.n;
  const of = new Uint8Array(n);
  const { met, wealth } = snapshot;
  if (colouring === 'group') {
    for (let i = 0; i < n; i++) of[i] = cast.group[i] % tokens.groups.length;
    return { colours: tokens.groups, of };
  }
  if (colouring === 'treated') {
    if (cast.treated !== null) of.set(cast.treated);
    return { colours: [tokens.quiet, tokens.ink], of };
  }
  if (colouring === 'wealth rank') {
    const r = ranks(wealth);
    for (let i = 0; i < n; i++) of[i] = Math.round(r[i] * (STEPS - 1));
    return { colours: ramp(tokens.ramp), of };
  }
  if (!snapshot.decided) return { colours: [tokens.quiet], of };
  switch (colouring) {
    case 'status':
      for (let i = 0; i < n; i++) of[i] = Math.min(2, met[i]);
      return { colours: [tokens.frustrated, tokens.satisfied, tokens.deeper], of };
    case 'cause':
      for (let i = 0; i < n; i++) {
        const c = snapshot.cause[i];
        of[i] = c === CAUSE.local ? 1 : c === CAUSE.general ? 2 : snapshot.sheltered[i] === 1 ? 3 : 0;
      }
      return { colours: [tokens.quiet, tokens.frustrated, tokens.purple, tokens.green], of };
    case 'aspiration gap': {
      const a = snapshot.aspirations[0];
      for (let i = 0; i < n; i++) {
        const gap = a[i] > 0 ? 1 - wealth[i] / a[i] : 0;
        of[i] = Math.round(((Math.max(-1, Math.min(1, gap)) + 1) / 2) * (STEPS - 1));
      }
      return { colours: ramp([tokens.green, tokens.quiet, tokens.purple]), of };
    }
    case 'growth':
      for (let i = 0; i < n; i++) {
        // log scale: a halving and a doubling are equally far from standing still
        const g = wealth[i] > 0 ? Math.log2(snapshot.childWealth[i] / wealth[i]) : 0;
        of[i] = Math.round(((Math.max(-1, Math.min(1, g)) + 1) / 2) * (STEPS - 1));
      }
      return { colours: ramp([tokens.purple, tokens.quiet, tokens.green]), of };
  }
}

/**
 * Colours, shapes and halos of a field for a glide from one generation to the next (or a cut, when both are one).
 *
 * @param now - the generation shown at the end of the glide
 * @param before - the generation it glides from, or null for a cut
 * @param earlier - the generation before `now`, for halos on households whose status changed
 */
export function dress(
  now: Snapshot,
  before: Snapshot | null,
  earlier: Snapshot | null,
  colouring: Colouring,
  setting: Setting,
): Look {
  const n = setting.cast.n;
  const to = palette(now, colouring, setting);
  const from = before === null ? to : palette(before, colouring, setting);
  const colourTo = new Uint8Array(4 * n);
  const colourFrom = new Uint8Array(4 * n);
  const shape = new Uint8Array(4 * n);
  const inkTo = to.colours.map(rgb);
  const inkFrom = from.colours.map(rgb);
  const alpha = 232;
  let changes = 0;
  for (let i = 0; i < n; i++) {
    const a = inkTo[to.of[i]];
    const b = inkFrom[from.of[i]];
    colourTo[4 * i] = a[0];
    colourTo[4 * i + 1] = a[1];
    colourTo[4 * i + 2] = a[2];
    colourTo[4 * i + 3] = alpha;
    colourFrom[4 * i] = b[0];
    colourFrom[4 * i + 1] = b[1];
    colourFrom[4 * i + 2] = b[2];
    colourFrom[4 * i + 3] = alpha;
    const ring = now.decided && now.met[i] === 0 ? 255 : 0;
    shape[4 * i] = before === null ? ring : before.decided && before.met[i] === 0 ? 255 : 0;
    shape[4 * i + 1] = ring;
    shape[4 * i + 2] = 51;
    const changed = now.decided && earlier?.decided === true && (now.met[i] === 0) !== (earlier.met[i] === 0);
    shape[4 * i + 3] = changed ? 255 : 0;
    if (changed) changes++;
  }
  // open rings apart, to lie on top: the frustrated are what the eye looks for
  let open = 0;
  for (let i = 0; i < n; i++) if (shape[4 * i + 1] !== 0) open++;
  const discs = new Uint32Array(n - open);
  const rings = new Uint32Array(open);
  const step = fairStep(n);
  let d = 0;
  let r = 0;
  for (let k = 0, i = 0; k < n; k++, i = (i + step) % n) {
    if (shape[4 * i + 1] === 0) discs[d++] = i;
    else rings[r++] = i;
  }
  return { colourFrom, colourTo, shape, discs, rings, changed: changes / Math.max(1, n) };
}

/** The legend of a colouring: which mark means what, always with the status shapes. */
export function legend(
  colouring: Colouring,
  tokens: Tokens,
  groupNames: readonly string[],
  milestones: number,
  decided: boolean,
  pockets: boolean,
): readonly LegendItem[] {
  const items: LegendItem[] = [];
  if (!decided && colouring !== 'group' && colouring !== 'treated' && colouring !== 'wealth rank') {
    return [{ kind: 'disc', colour: tokens.quiet, says: 'the last children: no decision yet' }];
  }
  if (colouring === 'status') {
    items.push({ kind: 'disc', colour: tokens.satisfied, says: milestones > 1 ? 'met one milestone' : 'satisfied' });
    if (milestones > 1) items.push({ kind: 'disc', colour: tokens.deeper, says: 'met more' });
    items.push({ kind: 'ring', colour: tokens.frustrated, says: 'frustrated' });
  } else {
    if (decided) {
      items.push({ kind: 'disc', colour: tokens.soft, says: 'satisfied' });
      items.push({ kind: 'ring', colour: tokens.soft, says: 'frustrated' });
    }
    switch (colouring) {
      case 'group':
        groupNames.slice(0, tokens.groups.length).forEach((name, k) => {
          items.push({ kind: 'disc', colour: tokens.groups[k], says: name });
        });
        break;
      case 'treated':
        items.push({ kind: 'disc', colour: tokens.ink, says: 'reached by a change' });
        items.push({ kind: 'disc', colour: tokens.quiet, says: 'not' });
        break;
      case 'wealth rank':
        items.push({ kind: 'ramp', colours: tokens.ramp, from: 'poorest', to: 'richest' });
        break;
      case 'aspiration gap':
        items.push({
          kind: 'ramp',
          colours: [tokens.green, tokens.quiet, tokens.purple],
          from: 'has twice its aspiration',
          to: 'far below it',
        });
        break;
      case 'growth':
        items.push({
          kind: 'ramp',
          colours: [tokens.purple, tokens.quiet, tokens.green],
          from: 'wealth halves',
          to: 'doubles',
        });
        break;
      case 'cause':
        items.push({ kind: 'ring', colour: tokens.frustrated, says: 'local' });
        items.push({ kind: 'ring', colour: tokens.purple, says: 'general' });
        items.push({ kind: 'disc', colour: tokens.green, says: 'sheltered' });
        break;
    }
  }
  if (pockets) items.push({ kind: 'tint', colour: tokens.frustrated, says: 'pocket, p ≤ 0.05' });
  return items;
}
