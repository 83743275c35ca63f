/**
 * The networks of one replicate's arms: built, read from a file, or derived from another arm by mixing.
 *
 * An arm that derives from another starts from that arm's ties of the same replicate, so everything but the
 * mixing is held fixed.
 */
import { build } from '../../network/build/build.js';
import { InputError } from '../../network/errors.js';
import type { Ties } from '../../network/graph.js';
import { mix } from '../../network/mix/mix.js';
import { stream } from '../random/stream.js';
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
 * @throws {InputError} when a network cannot be built or a mixing target is out of reach; the place names the arm
 */
export function buildNetworks(
  prepared: Prepared,
  population: Population,
  replicate: number,
  arms: readonly ArmFile[],
): Map<string, ArmNetwork> {
  const built = new Map<string, ArmNetwork>();
  const visit = (arm: ArmFile): ArmNetwork => {
    let network = built.get(arm.name);
    if (network === undefined) {
      network = atArm(arm, replicate, () => armNetwork(prepared, population, replicate, arm, visit));
      built.set(arm.name, network);
    }
    return network;
  };
  for (const arm of arms) visit(arm);
  return built;
}
