/**
 * Runs a study in-process, as text plus the texts of the files it names, and keeps every column of every generation.
 */
import type { Ties } from '../../network/graph.js';
import { loadInputs } from '../../sim/study/inputs.js';
import { parseStudy } from '../../sim/study/parse.js';
import type { ArmRecord } from '../../sim/study/record.js';
import { type Prepared, simulate } from '../../sim/study/replicate.js';

/** A generation that decided; all columns of length n. */
export interface Kept {
  readonly wealth: Float64Array;
  readonly aspirations: readonly Float64Array[];
  readonly investment: Float64Array;
  readonly consumption: Float64Array;
  readonly planned: Float64Array;
  readonly shock: Float64Array;
  readonly childWealth: Float64Array;
  readonly met: Uint8Array;
  readonly isolated: Uint8Array;
}

export interface KeptArm {
  readonly start: ArmRecord;
  readonly ties: Ties;
  /** t = 0 … T − 1. */
  readonly generations: Kept[];
  /** Wealth of generation T. */
  readonly heirs: Float64Array;
}

export async function prepare(yaml: string, files: Readonly<Record<string, string>> = {}): Promise<Prepared> {
  const parsed = parseStudy(yaml, 'study.yaml');
  const inputs = await loadInputs(parsed, async (path) => files[path] ?? null);
  return { study: parsed.study, inputs };
}

/** One replicate of a prepared study, by arm name. */
export function runReplicate(prepared: Prepared, replicate = 0, only?: readonly string[]): Map<string, KeptArm> {
  const arms = new Map<string, KeptArm>();
  let start: ArmRecord;
  let generations: Kept[] = [];
  simulate(
    prepared,
    replicate,
    {
      armStarts(record) {
        start = record;
        generations = [];
      },
      generation({ decided, columns }) {
        if (!decided) {
          arms.set(start.arm, { start, ties: start.ties, generations, heirs: columns.wealth.slice() });
          return;
        }
        generations.push({
          wealth: columns.wealth.slice(),
          aspirations: columns.aspirations.map((a) => a.slice()),
          investment: columns.investment.slice(),
          consumption: columns.consumption.slice(),
          planned: columns.planned.slice(),
          shock: columns.shock.slice(),
          childWealth: columns.childWealth.slice(),
          met: columns.met.slice(),
          isolated: columns.isolated.slice(),
        });
      },
      armEnds() {},
    },
    only,
  );
  return arms;
}

/** The only arm of a study's first replicate. */
export async function runOne(yaml: string, files: Readonly<Record<string, string>> = {}): Promise<KeptArm> {
  return [...runReplicate(await prepare(yaml, files)).values()][0]!;
}
