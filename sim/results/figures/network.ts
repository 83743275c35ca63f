/**
 * A network on paper: households where the map put them, their ties behind, discs satisfied and open rings frustrated.
 *
 * Marks of a kind are one path of round-ended points and ties one path of lines, about ten bytes each; a network that
 * is drawn more than once keeps its ties in a definition of their own. Says nothing of how households came to their
 * places.
 */
import { figure, type Size, safe } from './figure.js';

export interface NetworkOnPaper {
  /** x, y by household, length 2n, in any units. */
  readonly positions: ArrayLike<number>;
  /** Households to mark. */
  readonly household: ArrayLike<number>;
  /** Milestones met by each of `household`. */
  readonly met: ArrayLike<number>;
}

/** Positions in a square of this many units a side. */
const SIDE = 520;
const MARGIN = 8;

/** Share of households at each end that may lie outside the frame, and the room left round the others. */
const OUTSIDE = 0.005;
const ROOM = 1.1;

/** From a layout's units to the square, keeping the shape; the few that lie far out stand at the edge. */
function placer(positions: ArrayLike<number>): (i: number) => readonly [number, number] {
  const n = positions.length / 2;
  const ends = (offset: number): readonly [number, number] => {
    const sorted = Float64Array.from({ length: n }, (_, i) => positions[2 * i + offset]).sort();
    return [sorted[Math.floor(OUTSIDE * (n - 1))], sorted[Math.ceil((1 - OUTSIDE) * (n - 1))]];
  };
  const [left, right] = ends(0);
  const [top, bottom] = ends(1);
  const scale = (SIDE - 2 * MARGIN) / Math.max(ROOM * (right - left), ROOM * (bottom - top), 1e-9);
  const [x0, y0] = [SIDE / 2 - (scale * (left + right)) / 2, SIDE / 2 - (scale * (top + bottom)) / 2];
  const hold = (v: number): number => Math.max(MARGIN, Math.min(SIDE - MARGIN, Math.round(v)));
  return (i) => [hold(x0 + scale * positions[2 * i]), hold(y0 + scale * positions[2 * i + 1])];
}

/**
 * Ties as a definition that drawings on the same page refer to.
 *
 * @param id - its name on the page
 * @param most - ties drawn at most, evenly over the list
 * @returns the definition, to stand once before the drawings, and how many ties it holds
 */
export function tiesDefinition(
  id: string,
  positions: ArrayLike<number>,
  source: ArrayLike<number>,
  target: ArrayLike<number>,
  most: number,
): { readonly svg: string; readonly drawn: number } {
  const at = placer(positions);
  const m = source.length;
  const drawn = Math.min(m, most);
  let path = '';
  for (let k = 0; k < drawn; k++) {
    const e = Math.floor((k * m) / drawn);
    const [x, y] = at(source[e]);
    const [u, v] = at(target[e]);
    path += `M${x} ${y}l${u - x} ${v - y}`;
  }
  return {
    svg: `<svg class="hidden" width="0" height="0" aria-hidden="true"><defs><path id="${safe(id)}" d="${path}"/></defs></svg>`,
    drawn,
  };
}

/**
 * The drawing.
 *
 * @param ties - id of a definition of ties, or null for none
 * @param most - households marked at most, evenly over the list
 */
export function networkFigure(
  f: NetworkOnPaper,
  ties: string | null,
  most: number,
  title: string,
  described: string,
): string {
  const at = placer(f.positions);
  const n = f.household.length;
  const marked = Math.min(n, most);
  let discs = '';
  let rings = '';
  for (let k = 0; k < marked; k++) {
    const i = Math.floor((k * n) / marked);
    const [x, y] = at(f.household[i]);
    if (f.met[i] === 0) rings += `M${x} ${y}h0`;
    else discs += `M${x} ${y}h0`;
  }
  const size: Size = { width: SIDE, height: SIDE };
  return figure(
    size,
    title,
    described,
    `${ties === null ? '' : `<use href="#${safe(ties)}" class="n-tie"/>`}<path class="n-disc" d="${discs}"/>` +
      `<path class="n-ring" d="${rings}"/><path class="n-hole" d="${rings}"/>`,
  );
}

/** Style of the drawing, in the colours named. */
export function networkStyle(c: {
  readonly ink: string;
  readonly panel: string;
  readonly satisfied: string;
  readonly frustrated: string;
}): string {
  return `
.figure .n-tie{stroke:${c.ink};stroke-opacity:.09;stroke-width:1;fill:none}
.figure .n-disc{stroke:${c.satisfied};stroke-width:7px;stroke-linecap:round;fill:none}
.figure .n-ring{stroke:${c.frustrated};stroke-width:10px;stroke-linecap:round;fill:none}
.figure .n-hole{stroke:${c.panel};stroke-width:4.6px;stroke-linecap:round;fill:none}
`;
}
