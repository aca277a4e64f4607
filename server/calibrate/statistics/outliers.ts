import { median } from '../../analysis/align/robustLine.js';

/** Beyond this modified z-score a value is called an outlier. */
const OUTLYING = 3.5;
/** A normal distribution's standard deviation over its median absolute deviation. */
const MAD_TO_SD = 1.4826;

export interface Robust {
  readonly median: number;
  /** Scaled so that it is a standard deviation where the values are normal. */
  readonly sd: number;
  /** For each value. */
  readonly outlying: readonly boolean[];
}

/**
 * Median and median absolute deviation, and which values lie out: a modified z-score beyond 3.5
 * (B. Iglewicz and D. C. Hoaglin, How to Detect and Handle Outliers, 1993).
 * @param leastSd what the values cannot be known better than, such as a count's rounding
 */
export function robustly(values: readonly number[], leastSd = 0): Robust {
  const middle = median(values);
  const mad = median(values.map((value) => Math.abs(value - middle)));
  const sd = Math.max(MAD_TO_SD * mad, leastSd);
  const outlying = values.map((value) => Math.abs(value - middle) > OUTLYING * sd);
  return { median: middle, sd, outlying };
}
