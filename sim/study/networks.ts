/**
 * The networks of one replicate's arms: built, read from a file, or derived from another arm by mixing.
 *
 * An arm that derives from another starts from that arm's ties of the same replicate, so everything but the
 * mixing is held fixed.
 */
import { build, type Given } from '../../network/build/build.js';
import { reached } from '../../network/build/reached.js';
import { InputError } from '../../network/errors.js';
import type { Ties } from '../../network/graph.js';
import { mix } from '../../network/mix/mix.js';
import { stream } from '../random/stream.js';
import type { Study } from './complete.js';
import type { Population } from './population.js';
import type { NetworkReport } from './record.js';
import type { Prepared } from './replicate.js';
import type { ArmFile } from './schema.js';

/** An arm's ties and what was asked and reached. */
export interface ArmNetwork {
  readonly ties: Ties;
  readonly report: NetworkReport;
}

/**
 * Builds the networks of the given arms and of the arms these derive from.
 *
 * @param built - networks of this replicate that are there already; new ones are added
 * @throws {InputError} when a network cannot be built or a mixing target is out of reach; the place names the arm
 */
export function buildNetworks(
  prepared: Prepared,
  population: Population,
  replicate: number,
  arms: readonly ArmFile[],
  built: Map<string, ArmNetwork> = new Map(),
): Map<string, ArmNetwork> {
  const visit = (arm: ArmFile): ArmNetwork => {
    let network = built.get(arm.name);
    if (network === undefined) {
      network = atArm(prepared.study, arm, () => armNetwork(prepared, population, replicate, arm, visit));
      built.set(arm.name, network);
    }
    return network;
  };
  for (const arm of arms) visit(arm);
  return built;
}

function armNetwork(
  prepared: Prepared,
  population: Population,
  replicate: number,
  arm: ArmFile,
  visit: (arm: ArmFile) => ArmNetwork,
): ArmNetwork {
  const { study, inputs } = prepared;
  const { labels } = population;
  const { network } = arm;
  if ('from' in network) {
    const source = visit(study.arms.find((other) => other.name === network.from)!);
    if (network.mixing === undefined) return source;
    const mixed = mix(source.ties, network.mixing, labels, stream(study.seed, replicate, `mixing:${arm.name}`));
    return {
      ties: mixed.ties,
      report: {
        kind: 'mixed',
        asked: { from: network.from, ...network.mixing },
        reached: { ...reached(mixed.ties, labels) },
        mixing: {
          target: mixed.target ?? 'share',
          asked: mixed.asked,
          reached: mixed.reached,
          tried: mixed.tried,
          accepted: mixed.accepted,
          outOfReach: mixed.outOfReach,
        },
      },
    };
  }
  const given: Given = {
    ...(network.kind === 'file' ? { ties: inputs.ties[network.path]! } : {}),
    ...(network.kind === 'configuration' && network.degrees.kind === 'file'
      ? { degrees: inputs.degrees[network.degrees.path]! }
      : {}),
  };
  const ties = build(network, labels, stream(study.seed, replicate, `network:${arm.name}`), given);
  const { kind, ...asked } = network;
  return {
    ties,
    report: { kind, asked: flat(asked), reached: { ...reached(ties, labels) } },
  };
}

/** Numbers and words of what was asked, inner groups joined with a dot. */
function flat(object: object, prefix = ''): Record<string, number | string | boolean> {
  const out: Record<string, number | string | boolean> = {};
  for (const [key, value] of Object.entries(object)) {
    if (value === undefined) continue;
    if (typeof value === 'object' && value !== null) Object.assign(out, flat(value, `${prefix}${key}.`));
    else out[prefix + key] = value as number | string | boolean;
  }
  return out;
}

/** Gives errors of builders and mixing their place in the study: `arms[1].network.mixing.value`. */
function atArm(study: Study, arm: ArmFile, work: () => ArmNetwork): ArmNetwork {
  try {
    return work();
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    const at = `arms[${study.arms.indexOf(arm)}].network`;
    throw new InputError(
      error.problems.map((found) => ({
        ...found,
        place: found.place.startsWith('arms[') ? found.place : `${at}.${found.place.replace(/^network\.?/, '')}`,
      })),
    );
  }
}
