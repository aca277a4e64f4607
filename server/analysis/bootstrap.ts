import { quantile } from './align/robustLine.js';

export interface Interval {
  readonly estimate: number;
  readonly low: number;
  readonly high: number;
  /** Standard deviation of the resampled estimates. */
  readonly standardError: number;
}

const ROUNDS = 2_000;

/**
 * Percentile bootstrap (B. Efron and R. J. Tibshirani, An Introduction to the Bootstrap, 1993,
 * chapters 6 and 13): units (laps of one session, or animals) are drawn with replacement.
 * @param seed the same seed gives the same interval
 */
export function bootstrap<T>(
  units: readonly T[],
  of: (sample: readonly T[]) => number,
  seed: number,
  level = 0.95,
  rounds = ROUNDS,
): Interval {
  const random = xorshift(seed);
  const drawn: T[] = new Array(units.length);
  const estimates: number[] = [];
  for (let round = 0; round < rounds; round++) {
    for (let i = 0; i < units.length; i++) drawn[i] = units[Math.floor(random() * units.length)]!;
    const estimate = of(drawn);
    if (!Number.isNaN(estimate)) estimates.push(estimate);
  }
  const mean = meanOf(estimates);
  const variance = meanOf(estimates.map((value) => (value - mean) ** 2));
  return {
    estimate: of(units),
    low: quantile(estimates, (1 - level) / 2),
    high: quantile(estimates, (1 + level) / 2),
    standardError: Math.sqrt(variance),
  };
}

export function meanOf(values: readonly number[]): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length;
}

/** A seed made of a text: the same text, the same draws. */
export function seedOf(text: string): number {
  return [...text].reduce((sum, c) => (sum * 31 + c.charCodeAt(0)) | 0, 7);
}

/** Shifts 13, 17, 5 (G. Marsaglia, Journal of Statistical Software 8(14), 2003); [0, 1). */
export function xorshift(seed: number): () => number {
  let state = seed | 0 || 1;
  return () => {
    state ^= state << 13;
    state ^= state >>> 17;
    state ^= state << 5;
    return (state >>> 0) / 0x1_0000_0000;
  };
}
