import { describe, expect, test } from 'vitest';
import { factsOf, householdsOf, runReplicate } from '../../../sim/results/run-replicate.js';
import { memoryStore } from '../../../sim/results/store.js';
import { loadInputs } from '../../../sim/study/inputs.js';
import { parseStudy } from '../../../sim/study/parse.js';
import { memoryWords, needs } from '../../../viewer/run/needs.js';
import { SAMPLE } from '../sheet/sample.js';

const BASE = 60e6;

async function resultsOf(text: string): Promise<{ bytes: number; estimated: number }> {
  const parsed = parseStudy(text, 'study');
  const prepared = { study: parsed.study, inputs: await loadInputs(parsed, async () => null) };
  const facts = factsOf(prepared);
  const store = memoryStore();
  for (let r = 0; r < prepared.study.replicates; r++) runReplicate(prepared, facts, store, r, () => {});
  let bytes = 0;
  for (const one of store.files.values()) bytes += one.length;
  const n = householdsOf(prepared);
  const needed = needs(prepared.study, n);
  // the estimate holds parts and final tables, both there for a moment
  return { bytes, estimated: (needed.bytes - BASE - needed.work) / 2 };
}

describe('what a run needs', () => {
  test.each([
    ['the panel as Parquet', SAMPLE],
    ['the panel as CSV too', `${SAMPLE}keep: {formats: [parquet, csv]}\n`],
    ['a part of the panel', `${SAMPLE}keep: {panel: {replicates: 1, every: 2, households: 100}}\n`],
  ])('is within half and twice of what the parts weigh: %s', async (_, text) => {
    const { bytes, estimated } = await resultsOf(text.replace('households: 300', 'households: 1200'));
    // a reader decides by the order of size; compression depends on the numbers
    expect(estimated / bytes).toBeGreaterThan(0.5);
    expect(estimated / bytes).toBeLessThan(2);
  });

  test('grows with households, arms, replicates and generations', () => {
    const { study } = parseStudy(SAMPLE, 'study');
    expect(needs(study, 300).householdGenerations).toBe(300 * 2 * 4 * 6);
    expect(needs(study, 600).bytes).toBeGreaterThan(needs(study, 300).bytes);
    expect(needs({ ...study, replicates: 8 }, 300).rows).toBe(2 * needs(study, 300).rows);
    expect(needs({ ...study, keep: { ...study.keep, panel: 'none' } }, 300).rows).toBe(0);
  });

  test('in words', () => {
    const { study } = parseStudy(SAMPLE, 'study');
    expect(memoryWords({ ...needs(study, 300), bytes: 214e6 })).toBe('needs about 210 MB of memory');
    expect(memoryWords({ ...needs(study, 300), bytes: 2.34e9 })).toBe('needs about 2.3 GB of memory');
  });
});
