/**
 * Poverty below a line: headcount, gap and squared gap (Foster, Greer and Thorbecke 1984).
 *
 * Poor means strictly below the line. Does not choose the line; 60 % of the median is common practice.
 */
import { sampleOf, type Values, type Weighting } from './sample.js';

/** FGT measures at one line. */
export interface Poverty {
  readonly line: number;
  /** FGT(0): share of rows (of weight) below the line. */
  readonly headcount: number;
  /** FGT(1): mean of 1 − y/line over the poor, 0 for the rest. */
  readonly gap: number;
  /** FGT(2): mean of (1 − y/line)². */
  readonly gap2: number;
}

/**
 * Foster–Greer–Thorbecke measures.
 *
 * @param line - in the unit of the values, above 0
 * @returns shares over all rows. Cost O(poor) after the sort.
 */
export function poverty(values: Values, line: number, weighting?: Weighting): Poverty {
  if (!(line > 0)) throw new RangeError(`line must be above 0, got ${line}`);
  const { n, value, weight, total } = sampleOf(values, weighting);
  let headcount = 0;
  let gap = 0;
  let gap2 = 0;
  for (let k = 0; k < n && value[k] < line; k++) {
    const w = weight === null ? 1 : weight[k];
    const d = 1 - value[k] / line;
    headcount += w;
    gap += w * d;
    gap2 += w * d * d;
  }
  return { line, headcount: headcount / total, gap: gap / total, gap2: gap2 / total };
}
