import { median } from '../../analysis/align/robustLine.js';
import { robustly } from '../statistics/outliers.js';
import type { Pass } from './passes.js';

/** A lap is the difference of two counts, each rounded to a whole one: variance 1/12 twice. */
const COUNT_SD = Math.sqrt(1 / 6);
/** Standard error of a median over that of a mean, where values are normal: sqrt(pi / 2). */
const MEDIAN_COSTS = Math.sqrt(Math.PI / 2);

/** Laps turned by hand, as the seam mark told them. */
export interface LapFit {
  /** As the belt was turned: -1 where counts fall as the animal runs. */
  readonly sign: 1 | -1;
  /** Counts of each lap, in order, and which of them lie out. */
  readonly laps: readonly { readonly counts: number; readonly outlying: boolean }[];
  /** Median of those that do not, and its standard error. */
  readonly lapCounts: number;
  readonly lapCountsError: number;
  /** Scatter of single laps, counts: what the encoder slips. */
  readonly lapSd: number;
  /** Width of the mark, counts. */
  readonly markCounts: number;
}

/** Which way most of the passes went; 1 when there are none. */
export function turnedWay(passes: readonly Pass[]): 1 | -1 {
  const ahead = passes.filter((pass) => pass.toCount > pass.fromCount).length;
  return ahead * 2 >= passes.length ? 1 : -1;
}

/**
 * Laps from passes of the mark: only between two passes the same way with no turning back between.
 * Outlying laps (a missed mark, a second one, a slip) are shown and left out of the median.
 * @returns undefined without two whole laps
 */
export function fitLaps(passes: readonly Pass[], sign: 1 | -1): LapFit | undefined {
  const counts: number[] = [];
  const widths: number[] = [];
  let before: number | undefined;
  for (const { fromCount, toCount } of passes) {
    if (Math.sign(toCount - fromCount) !== sign) {
      before = undefined;
      continue;
    }
    if (before !== undefined) counts.push((fromCount - before) * sign);
    widths.push(Math.abs(toCount - fromCount));
    before = fromCount;
  }
  if (counts.length < 2) return undefined;
  const robust = robustly(counts, COUNT_SD);
  const kept = counts.filter((_, i) => !robust.outlying[i]);
  return {
    sign,
    laps: counts.map((lap, i) => ({ counts: lap, outlying: robust.outlying[i]! })),
    lapCounts: median(kept),
    lapCountsError: (MEDIAN_COSTS * robust.sd) / Math.sqrt(kept.length),
    lapSd: robust.sd,
    markCounts: median(widths),
  };
}

/**
 * How far ahead of its place the mark's leading edge shows when the belt backs over it, counts: play
 * between belt and encoder, less the sensor's own hysteresis. One value for each pass back.
 */
export function backlashCounts(
  passes: readonly Pass[],
  sign: 1 | -1,
  lapCounts: number,
): readonly number[] {
  const found: number[] = [];
  let leading: number | undefined;
  for (const { fromCount, toCount } of passes) {
    if (Math.sign(toCount - fromCount) === sign) {
      leading = fromCount;
    } else if (leading !== undefined) {
      found.push(nearest((toCount - leading) * sign, lapCounts));
    }
  }
  return found;
}

/** The same place on the belt, within half a lap of 0. */
export function nearest(counts: number, lapCounts: number): number {
  return counts - Math.round(counts / lapCounts) * lapCounts;
}

/** What the rig file takes of a belt. */
export interface BeltScaleFit {
  readonly countsPerCm: number;
  readonly countsPerCmError: number;
}

/** Counts a cm, from counts a lap and the length once round; errors in quadrature. */
export function scaleOf(
  { lapCounts, lapCountsError }: Pick<LapFit, 'lapCounts' | 'lapCountsError'>,
  lengthCm: number,
  lengthErrorCm: number,
): BeltScaleFit {
  const countsPerCm = lapCounts / lengthCm;
  const share = Math.hypot(lapCountsError / lapCounts, lengthErrorCm / lengthCm);
  return { countsPerCm, countsPerCmError: countsPerCm * share };
}

/**
 * The belt place under the animal when the sensor meets the mark, from how far the belt was turned
 * on until the seam lay under the animal: the rig file's `offset`, within half a lap of 0, cm.
 */
export function offsetCm(turnedCounts: number, lapCounts: number, countsPerCm: number): number {
  const cm = nearest(-turnedCounts, lapCounts) / countsPerCm;
  return cm === 0 ? 0 : cm;
}
