/** Where on a closed belt events gather, and whether they do. */
export interface CircularSummary {
  readonly n: number;
  /** Place, [0, length) cm; null where there is no direction at all. */
  readonly meanCm: number | null;
  /** Mean resultant length: 0 spread all around, 1 all at one place. */
  readonly resultantLength: number;
  /** Of the Rayleigh test, against an even spread around the belt. */
  readonly pValue: number;
}

/**
 * Circular mean and mean resultant length (N. I. Fisher, Statistical Analysis of Circular Data,
 * 1993, section 2.3.1) and the Rayleigh test (section 4.3, equation 4.17, with z = n R^2).
 * Events of one lap depend on each other, so that p is too small for licks in bouts: give one place
 * a lap where that matters.
 */
export function circularSummary(positionsCm: readonly number[], lengthCm: number): CircularSummary {
  const n = positionsCm.length;
  if (n === 0) return { n, meanCm: null, resultantLength: 0, pValue: 1 };
  let cos = 0;
  let sin = 0;
  for (const cm of positionsCm) {
    const angle = (2 * Math.PI * cm) / lengthCm;
    cos += Math.cos(angle);
    sin += Math.sin(angle);
  }
  const resultantLength = Math.min(1, Math.hypot(cos, sin) / n);
  const turn = Math.atan2(sin, cos) / (2 * Math.PI);
  const meanCm = resultantLength < 1e-12 ? null : (turn < 0 ? turn + 1 : turn) * lengthCm;
  return { n, meanCm, resultantLength, pValue: rayleighP(n, resultantLength) };
}

function rayleighP(n: number, resultantLength: number): number {
  const z = n * resultantLength ** 2;
  const second = (2 * z - z ** 2) / (4 * n);
  const third = (24 * z - 132 * z ** 2 + 76 * z ** 3 - 9 * z ** 4) / (288 * n ** 2);
  // For small n; beyond 50 the first term is exact enough, and the rest could turn it negative.
  const p = Math.exp(-z) * (n < 50 ? 1 + second - third : 1);
  return Math.min(1, Math.max(0, p));
}
