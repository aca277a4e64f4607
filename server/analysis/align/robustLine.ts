/** A straight line: y = offset + slope * x. */
export interface Line {
  readonly offset: number;
  readonly slope: number;
}

/** Tuning constant at which the estimate keeps 95 % efficiency on normal errors. */
const HUBER_K = 1.345;
/** A normal distribution's standard deviation over its median absolute deviation. */
const MAD_TO_SD = 1.4826;
const MOST_ROUNDS = 50;

/**
 * Line by Huber's M-estimator (P. J. Huber, Annals of Mathematical Statistics 35, 1964, 73-101), by
 * iteratively reweighted least squares from the least-squares line, the scale taken anew each round
 * as 1.4826 times the median absolute residual. Two points at least.
 * @param k the tuning constant, in standard deviations; Infinity gives ordinary least squares
 */
export function robustLine(x: readonly number[], y: readonly number[], k = HUBER_K): Line {
  const weights = new Float64Array(x.length).fill(1);
  let line = weightedLine(x, y, weights);
  if (k === Number.POSITIVE_INFINITY) return line;
  for (let round = 0; round < MOST_ROUNDS; round++) {
    const residuals = x.map((value, i) => Math.abs(y[i]! - valueAt(line, value)));
    const scale = MAD_TO_SD * median(residuals);
    if (scale === 0) return line;
    residuals.forEach((residual, i) => {
      weights[i] = residual <= k * scale ? 1 : (k * scale) / residual;
    });
    const next = weightedLine(x, y, weights);
    const still = Math.abs(next.slope - line.slope) <= 1e-15 * Math.abs(line.slope);
    line = next;
    if (still) break;
  }
  return line;
}

export function valueAt({ offset, slope }: Line, x: number): number {
  return offset + slope * x;
}

/** Weighted least squares in closed form, about the means so that large times lose no digits. */
function weightedLine(x: readonly number[], y: readonly number[], weights: Float64Array): Line {
  let sum = 0;
  let meanX = 0;
  let meanY = 0;
  for (let i = 0; i < x.length; i++) {
    sum += weights[i]!;
    meanX += weights[i]! * x[i]!;
    meanY += weights[i]! * y[i]!;
  }
  meanX /= sum;
  meanY /= sum;
  let xx = 0;
  let xy = 0;
  for (let i = 0; i < x.length; i++) {
    const dx = x[i]! - meanX;
    xx += weights[i]! * dx * dx;
    xy += weights[i]! * dx * (y[i]! - meanY);
  }
  const slope = xx === 0 ? 1 : xy / xx;
  return { slope, offset: meanY - slope * meanX };
}

/** The middle value, or the mean of the two middle ones; NaN of none. */
export function median(values: readonly number[]): number {
  return quantile(values, 0.5);
}

/** Quantile by linear interpolation between order statistics (Hyndman and Fan 1996, type 7). */
export function quantile(values: readonly number[], p: number): number {
  const sorted = [...values].sort((a, b) => a - b);
  if (sorted.length === 0) return Number.NaN;
  const at = (sorted.length - 1) * p;
  const low = Math.floor(at);
  const high = Math.min(low + 1, sorted.length - 1);
  return sorted[low]! + (at - low) * (sorted[high]! - sorted[low]!);
}
