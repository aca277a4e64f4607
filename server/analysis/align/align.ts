import { countRuns, isPeriodic, matchPeriodic, type Window } from './matchPeriodic.js';
import { matchRandom, type Pair } from './matchRandom.js';
import { type Line, median, quantile, robustLine, valueAt } from './robustLine.js';

/** How one stretch of the other clock lies over the session's. */
export interface Alignment {
  /** Which acquisition in the file, from 1, and its edges. */
  readonly acquisition: number;
  readonly edges: number;
  readonly matched: number;
  readonly method: 'random intervals' | 'counted frames';
  /** First and last matched edge, in the session's seconds. */
  readonly fromS: number;
  readonly toS: number;
  /** Their time = offset + (1 + drift) * session time, by Huber's M-estimator. */
  readonly offsetS: number;
  readonly driftPpm: number;
  /** Distances of matched edges from that line; and from the curve that times are converted by. */
  readonly lineResidualsUs: Residuals;
  readonly residualsUs: Residuals;
  /** The curve: at these session times their clock is so much ahead of the line. */
  readonly knots: { readonly sessionS: readonly number[]; readonly aheadS: readonly number[] };
}
export interface Residuals {
  readonly median: number;
  readonly p99: number;
  readonly max: number;
}
export interface Refused {
  readonly acquisition: number;
  readonly refused: string;
}

const LEAST_SHARE = 0.6;
const MOST_DRIFT_PPM = 400;
const MOST_P99_US = 2_000;
/** Neighbours on each side whose median is the curve's value at an edge. */
const SIDE = 4;

/**
 * Matches the edges of each acquisition with ours and fits offset and drift, or says why not.
 * @param ref times of our edges, seconds since the session began, rising
 * @param acquisitions times of theirs, in seconds of their clock, rising in each
 * @param window from when to when ours were recorded
 */
export function align(
  ref: readonly number[],
  acquisitions: readonly (readonly number[])[],
  window?: Window,
): (Alignment | Refused)[] {
  const periodic = isPeriodic(ref);
  // As many acquisitions as runs of the frame clock: each is compared with its own.
  const inOrder = periodic && countRuns(ref) === acquisitions.length;
  return acquisitions.map((other, index) => {
    const acquisition = index + 1;
    const pairs = periodic
      ? matchPeriodic(ref, other, { only: inOrder ? index : undefined, window })
      : matchRandom(ref, other);
    if (typeof pairs === 'string') return { acquisition, refused: pairs };
    const method = periodic ? 'counted frames' : 'random intervals';
    return judge({ acquisition, edges: other.length, method, ...fitCurve(ref, other, pairs) });
  });
}

/** Their time of a session time, by the alignment's line and curve. */
export function convert(alignment: Alignment, sessionS: number): number {
  const { knots, offsetS, driftPpm } = alignment;
  const line = { offset: offsetS, slope: 1 + driftPpm / 1e6 };
  return valueAt(line, sessionS) + aheadAt(knots, sessionS);
}

function aheadAt({ sessionS, aheadS }: Alignment['knots'], at: number): number {
  let low = 0;
  let high = sessionS.length;
  while (low < high) {
    const middle = (low + high) >>> 1;
    if (sessionS[middle]! < at) low = middle + 1;
    else high = middle;
  }
  if (low === 0) return aheadS[0]!;
  if (low === sessionS.length) return aheadS[low - 1]!;
  const from = sessionS[low - 1]!;
  const share = (at - from) / (sessionS[low]! - from);
  return aheadS[low - 1]! + share * (aheadS[low]! - aheadS[low - 1]!);
}

function fitCurve(ref: readonly number[], other: readonly number[], pairs: readonly Pair[]) {
  const kept = withoutStrays(ref, other, pairs);
  const sessionS = kept.map((pair) => ref[pair.ref]!);
  const theirs = kept.map((pair) => other[pair.other]!);
  const line = robustLine(sessionS, theirs);
  const away = residuals(line, sessionS, theirs);
  const smooth = away.map((_, i) => around(away, i, true));
  const left = away.map((value, i) => value - around(away, i, false));
  return {
    matched: kept.length,
    fromS: sessionS[0]!,
    toS: sessionS.at(-1)!,
    offsetS: line.offset,
    driftPpm: (line.slope - 1) * 1e6,
    lineResidualsUs: summary(away),
    // Each edge against its neighbours alone: with itself among them it would flatter the curve.
    residualsUs: summary(left),
    knots: { sessionS, aheadS: smooth },
  };
}

function residuals(line: Line, x: readonly number[], y: readonly number[]): number[] {
  return x.map((value, i) => y[i]! - valueAt(line, value));
}

function around(values: readonly number[], i: number, withIt: boolean): number {
  const from = Math.max(0, i - SIDE);
  const near = values.slice(from, i + SIDE + 1);
  return median(withIt ? near : near.filter((_, k) => from + k !== i));
}

/** A spurious edge that happened to lie near one of ours stands out from its neighbours. */
function withoutStrays(ref: readonly number[], other: readonly number[], pairs: readonly Pair[]) {
  const x = pairs.map((pair) => ref[pair.ref]!);
  const y = pairs.map((pair) => other[pair.other]!);
  const away = residuals(robustLine(x, y), x, y);
  const left = away.map((value, i) => Math.abs(value - around(away, i, false)));
  const most = Math.max(200e-6, 8 * median(left));
  return pairs.filter((_, i) => left[i]! <= most);
}

function summary(values: readonly number[]): Residuals {
  const us = values.map((value) => Math.abs(value) * 1e6);
  return { median: median(us), p99: quantile(us, 0.99), max: quantile(us, 1) };
}

function judge(alignment: Alignment): Alignment | Refused {
  const { acquisition, matched, edges, driftPpm, residualsUs } = alignment;
  const refuse = (refused: string) => ({ acquisition, refused });
  if (matched < LEAST_SHARE * edges)
    return refuse(`only ${matched} of its ${edges} edges meet one of the record's`);
  if (Math.abs(driftPpm) > MOST_DRIFT_PPM)
    return refuse(`the clocks would differ by ${driftPpm.toFixed(0)} ppm, which no crystal does`);
  if (residualsUs.p99 > MOST_P99_US)
    return refuse(`matched edges lie up to ${(residualsUs.p99 / 1e3).toFixed(1)} ms apart (p99)`);
  return alignment;
}
