/**
 * Builds a network of any kind: the registry of kinds.
 *
 * A new kind is one file beside this one, its interface in spec.ts, and one line here.
 */
import type { Labels, Ties, Uniform } from '../graph.js';
import { blocks } from './blocks.js';
import { configuration } from './configuration.js';
import { named } from './named.js';
import { preferential } from './preferential.js';
import { random } from './random.js';
import { ring } from './ring.js';
import { similarity } from './similarity.js';
import { spatial } from './spatial.js';
import type { NetworkSpec } from './spec.js';

/** What the caller read from files the spec names: builders never open one. */
export interface Given {
  /** Ties of `kind: file`, households numbered as in `labels`. */
  readonly ties?: Ties;
  /** Degrees of `degrees: {kind: file}`, length n. */
  readonly degrees?: ArrayLike<number>;
}

type Builder<K extends NetworkSpec['kind']> = (
  spec: Extract<NetworkSpec, { kind: K }>,
  labels: Labels,
  uniform: Uniform,
  given: Given,
) => Ties;

const BUILDERS: { readonly [K in NetworkSpec['kind']]: Builder<K> } = {
  blocks,
  similarity,
  ring,
  random,
  preferential,
  spatial,
  configuration: (spec, labels, uniform, given) => configuration(spec, labels, uniform, given.degrees ?? null),
  named,
  file: (_spec, labels, _uniform, given) => {
    if (given.ties === undefined) throw new Error('build: the ties of a file were not read by the caller');
    if (given.ties.n !== labels.n) throw new Error(`build: ties of ${given.ties.n} households for ${labels.n}`);
    return given.ties;
  },
};

/** Every kind `build` knows, in the order of the documentation. */
export const NETWORK_KINDS = Object.keys(BUILDERS) as readonly NetworkSpec['kind'][];

/**
 * The ties a spec asks for among these households.
 *
 * @param spec - kind and its settings, keys as in a study file
 * @param labels - places, groups and wealth of the households
 * @param uniform - seeded stream; the same stream gives the same ties in every engine
 * @param given - what was read from files
 * @throws InputError when such a network cannot exist with these households; `place` is `network.` and the key
 */
export function build(spec: NetworkSpec, labels: Labels, uniform: Uniform, given: Given = {}): Ties {
  // the registry pairs each kind with its own builder; TypeScript cannot follow that through the index
  const builder = BUILDERS[spec.kind] as (s: NetworkSpec, l: Labels, u: Uniform, g: Given) => Ties;
  return builder(spec, labels, uniform, given);
}
