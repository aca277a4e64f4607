/** Order statistics of round trips, all in the unit of the values given. */
export interface Quantiles {
  readonly n: number;
  readonly p50: number;
  readonly p90: number;
  readonly p99: number;
  readonly p999: number;
  readonly max: number;
}

/** The value at or above which `1 - share` of the sorted values lie (nearest rank). */
export function quantile(sorted: readonly number[] | Float64Array, share: number): number {
  if (sorted.length === 0) return Number.NaN;
  return sorted[Math.min(sorted.length - 1, Math.max(0, Math.ceil(share * sorted.length) - 1))]!;
}

export function quantilesOf(values: readonly number[]): Quantiles {
  const sorted = Float64Array.from(values).sort();
  return {
    n: sorted.length,
    p50: quantile(sorted, 0.5),
    p90: quantile(sorted, 0.9),
    p99: quantile(sorted, 0.99),
    p999: quantile(sorted, 0.999),
    max: quantile(sorted, 1),
  };
}

export function median(values: readonly number[]): number {
  return quantile(Float64Array.from(values).sort(), 0.5);
}
