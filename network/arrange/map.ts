/**
 * The map: households in the plane, drawn together by their ties.
 *
 * ngraph.forcelayout from a label-free spectral start (spectral.ts). Never start it from place or group labels: a force
 * layout keeps what it is given for hundreds of steps, and would show a segregation that is not in the ties. Its
 * ready-made plane build is imported because the other makes code at run time, which a strict content security policy
 * forbids. For drawing only: positions enter no result.
 */
import createLayout from 'ngraph.forcelayout/dist/ngraph.forcelayout2d.js';
import createGraph from 'ngraph.graph';
import type { Ties, Uniform } from '../graph.js';
import { toPairs } from '../graph.js';
import { spectral } from './spectral.js';

/** Settled in 20–50 steps at 10,000 households; the library's defaults move one unit a step and need hundreds. */
const PHYSICS = {
  theta: 1.2,
  timeStep: 20,
  springCoefficient: 0.01,
  gravity: -0.3,
  dragCoefficient: 0.5,
  nodeMass: (): number => 1,
} as const;

export interface MapOptions {
  /** Layout steps; default 50 up to 20,000 households, 20 above. */
  readonly steps?: number | undefined;
  /** Called after each step with the share done, 0 … 1. */
  readonly onProgress?: ((share: number) => void) | undefined;
}

/**
 * @param ties - the network; weights play no part
 * @param uniform - seeded stream for the start; another seed gives another, equally true drawing
 * @returns x, y by household, length 2n, in the layout's own units, centred on 0. Households without ties stand on a
 *   ring round the others. Cost O(steps · (n log n + m)): about two seconds for 10,000 households with ten ties.
 */
export function map(ties: Ties, uniform: Uniform, options: MapOptions = {}): Float32Array<ArrayBuffer> {
  const { n, start } = ties;
  const steps = options.steps ?? (n <= 20_000 ? 50 : 20);
  const begin = spectral(ties, uniform);
  const graph = createGraph();
  let tied = 0;
  for (let i = 0; i < n; i++) {
    if (start[i + 1] === start[i]) continue;
    graph.addNode(i);
    tied++;
  }
  const { source, target } = toPairs(ties);
  for (let e = 0; e < source.length; e++) graph.addLink(source[e], target[e]);
  const out = new Float32Array(2 * n);
  if (tied > 0) {
    const layout = createLayout(graph, PHYSICS);
    // springs are ten units long: room for everyone at about that distance
    const room = 5 * Math.sqrt(tied);
    for (let i = 0; i < n; i++) {
      if (start[i + 1] === start[i]) continue;
      layout.setNodePosition(i, rounded(begin[2 * i] * room), rounded(begin[2 * i + 1] * room));
    }
    for (let s = 0; s < steps; s++) {
      layout.step();
      options.onProgress?.((s + 1) / steps);
    }
    for (let i = 0; i < n; i++) {
      if (start[i + 1] === start[i]) continue;
      const { x, y } = layout.getNodePosition(i);
      out[2 * i] = x;
      out[2 * i + 1] = y;
    }
    layout.dispose();
  }
  centre(out, ties, tied);
  ringOfIsolates(out, ties, begin);
  return out;
}

/** To 1/1024: engines that differ in a last digit then start the layout alike. */
function rounded(x: number): number {
  return Math.round(x * 1024) / 1024;
}

function centre(out: Float32Array, ties: Ties, tied: number): void {
  if (tied === 0) return;
  let x = 0;
  let y = 0;
  for (let i = 0; i < ties.n; i++) {
    x += out[2 * i];
    y += out[2 * i + 1];
  }
  for (let i = 0; i < ties.n; i++) {
    if (ties.start[i + 1] === ties.start[i]) continue;
    out[2 * i] -= x / tied;
    out[2 * i + 1] -= y / tied;
  }
}

/** Households without ties, in the direction of their random start, a little outside everyone else. */
function ringOfIsolates(out: Float32Array, ties: Ties, begin: Float64Array): void {
  let radius = 1;
  for (let i = 0; i < ties.n; i++) {
    radius = Math.max(radius, Math.sqrt(out[2 * i] * out[2 * i] + out[2 * i + 1] * out[2 * i + 1]));
  }
  for (let i = 0; i < ties.n; i++) {
    if (ties.start[i + 1] > ties.start[i]) continue;
    const x = begin[2 * i];
    const y = begin[2 * i + 1];
    const length = Math.sqrt(x * x + y * y) || 1;
    out[2 * i] = (1.05 * radius * x) / length;
    out[2 * i + 1] = (1.05 * radius * y) / length;
  }
}
