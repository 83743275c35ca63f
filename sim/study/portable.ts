/**
 * A study whose files lie in a folder of its own, so that a results folder can be moved and run again.
 */
import type { Study } from './complete.js';
import { filesOf } from './inputs.js';
import type { Prepared } from './replicate.js';

const FOLDER = 'inputs';

/** The study with its files renamed to `inputs/NAME`; the texts and parsed columns follow. Idempotent. */
export function portable(prepared: Prepared): Prepared {
  const { study, inputs } = prepared;
  const renamed = new Map<string, string>();
  const taken = new Set<string>();
  for (const { path } of filesOf(study)) {
    if (renamed.has(path)) continue;
    const base = path.split(/[\\/]/).at(-1)!;
    let name = `${FOLDER}/${base}`;
    for (let k = 2; taken.has(name); k++) name = `${FOLDER}/${k}-${base}`;
    taken.add(name);
    renamed.set(path, name);
  }
  if (renamed.size === 0) return prepared;
  const local = (path: string): string => renamed.get(path) ?? path;
  const keyed = <V>(record: Readonly<Record<string, V>>): Record<string, V> =>
    Object.fromEntries(Object.entries(record).map(([path, value]) => [local(path), value]));
  const { population } = study;
  const moved: Study = {
    ...study,
    population: {
      ...population,
      ...(population.households_file === undefined ? {} : { households_file: local(population.households_file) }),
      ...(population.wealth?.sample === undefined
        ? {}
        : {
            wealth: {
              ...population.wealth,
              sample: { ...population.wealth.sample, file: local(population.wealth.sample.file) },
            },
          }),
    },
    arms: study.arms.map((arm) => {
      const { network } = arm;
      if (!('kind' in network)) return arm;
      if (network.kind === 'file') return { ...arm, network: { ...network, path: local(network.path) } };
      if (network.kind === 'configuration' && network.degrees.kind === 'file') {
        const degrees = { ...network.degrees, path: local(network.degrees.path) };
        return { ...arm, network: { ...network, degrees } };
      }
      return arm;
    }),
  };
  return {
    study: moved,
    inputs: { ...inputs, ties: keyed(inputs.ties), degrees: keyed(inputs.degrees), texts: keyed(inputs.texts) },
  };
}
