import { studentT } from './studentT.js';

/** A least-squares line y = offset + slope x, and how well it is known. */
export interface FittedLine {
  readonly offset: number;
  readonly slope: number;
  /** Standard errors. */
  readonly offsetError: number;
  readonly slopeError: number;
  /** Standard deviation of the residuals, with `freedom` degrees. */
  readonly residualSd: number;
  readonly freedom: number;
  /** y less the line, in the order given. */
  readonly residuals: readonly number[];
  /** Of determination. */
  readonly r2: number;
  readonly meanX: number;
  readonly xx: number;
}

/**
 * Ordinary least squares with an intercept, about the means so that no digits are lost.
 *
 * N. R. Draper and H. Smith, Applied Regression Analysis, 3rd edition, chapter 1.
 * @throws RangeError for fewer than three points, or points that all have the same x
 */
export function fitLine(x: readonly number[], y: readonly number[]): FittedLine {
  const n = x.length;
  if (n < 3 || y.length !== n) throw new RangeError('a line needs three points or more');
  const meanX = mean(x);
  const meanY = mean(y);
  let xx = 0;
  let xy = 0;
  let yy = 0;
  for (let i = 0; i < n; i++) {
    const dx = x[i]! - meanX;
    const dy = y[i]! - meanY;
    xx += dx * dx;
    xy += dx * dy;
    yy += dy * dy;
  }
  if (!(xx > 0)) throw new RangeError('a line needs points at different x');
  const slope = xy / xx;
  const offset = meanY - slope * meanX;
  const residuals = x.map((value, i) => y[i]! - meanY - slope * (value - meanX));
  const left = residuals.reduce((sum, r) => sum + r * r, 0);
  const freedom = n - 2;
  const residualSd = Math.sqrt(left / freedom);
  return {
    offset,
    slope,
    offsetError: residualSd * Math.sqrt(1 / n + (meanX * meanX) / xx),
    slopeError: residualSd / Math.sqrt(xx),
    residualSd,
    freedom,
    residuals,
    r2: yy > 0 ? 1 - left / yy : Number.NaN,
    meanX,
    xx,
  };
}

/**
 * Half the width of the confidence band of the line itself at `x` (Draper and Smith, section 3.1):
 * where the line may lie, not where the next point will.
 */
export function bandAt(line: FittedLine, x: number, level = 0.95): number {
  const n = line.freedom + 2;
  const away = x - line.meanX;
  const error = line.residualSd * Math.sqrt(1 / n + (away * away) / line.xx);
  return studentT(level, line.freedom) * error;
}

export function mean(values: readonly number[]): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length;
}

/** Standard deviation of a sample, with n - 1. */
export function sampleSd(values: readonly number[]): number {
  const middle = mean(values);
  const left = values.reduce((sum, value) => sum + (value - middle) ** 2, 0);
  return Math.sqrt(left / (values.length - 1));
}
