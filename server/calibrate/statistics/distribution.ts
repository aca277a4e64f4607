import { quantile } from '../../analysis/align/robustLine.js';

/** A distribution as a person reads it: counts in bins, and the numbers worth saying. */
export interface Distribution {
  readonly n: number;
  readonly median: number;
  readonly p95: number;
  readonly p99: number;
  readonly most: number;
  /** Bin i holds what is at least `edges[i]` and below `edges[i + 1]`. */
  readonly edges: readonly number[];
  readonly counts: readonly number[];
}

/** Values in bins between the edges given; what lies outside goes into the outermost bins. */
export function distribution(values: readonly number[], edges: readonly number[]): Distribution {
  const counts: number[] = new Array(edges.length - 1).fill(0);
  for (const value of values) {
    let bin = 0;
    while (bin < counts.length - 1 && value >= edges[bin + 1]!) bin++;
    counts[bin]!++;
  }
  const at = (p: number) => quantile(values, p);
  return {
    ...{ n: values.length, median: at(0.5), p95: at(0.95), p99: at(0.99), most: at(1) },
    ...{ edges, counts },
  };
}

/** Edges that grow by a constant factor: `perDecade` bins a decade from `least` to at least `most`. */
export function logEdges(least: number, most: number, perDecade: number): number[] {
  const bins = Math.ceil(Math.log10(most / least) * perDecade);
  return Array.from({ length: bins + 1 }, (_, n) => least * 10 ** (n / perDecade));
}
