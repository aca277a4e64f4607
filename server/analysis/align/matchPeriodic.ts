import type { Pair, Why } from './matchRandom.js';
import { median } from './robustLine.js';

/** Most of the intervals lie this close to the usual one: a frame clock, no random train. */
const REGULAR = 0.02;
/** A longer pause than this many periods ends a run of frames. */
const PAUSE = 5;

/** True for a frame clock: intervals say nothing there, only counts and pauses do. */
export function isPeriodic(times: readonly number[]): boolean {
  if (times.length < 4) return false;
  const gaps = intervals(times);
  const usual = median(gaps);
  return median(gaps.map((gap) => Math.abs(gap - usual))) < REGULAR * usual;
}

/**
 * Matches a periodic frame clock by counting: each run of frames between pauses is numbered in
 * periods from its first, so that single lost frames leave a gap in the numbers. The other's runs
 * are laid over ours where all have the same lengths, and refused where none or several do.
 * @param only compare with this run of ours alone, from 0: acquisitions that are known in order
 */
export function matchPeriodic(
  ref: readonly number[],
  other: readonly number[],
  only?: number,
): Pair[] | Why {
  const all = runsOf(ref);
  const ours = only === undefined ? all : all.slice(only, only + 1);
  const theirs = runsOf(other);
  const places: number[] = [];
  for (let at = 0; at + theirs.length <= ours.length; at++) {
    const same = theirs.every((run, r) => lengthOf(run) === lengthOf(ours[at + r]!));
    if (same) places.push(at);
  }
  const lengths = (runs: readonly Run[]) => runs.map(lengthOf).join(', ');
  if (places.length === 0)
    return (
      `no run of the record's frames is as long: theirs ${lengths(theirs)} periods, ` +
      `the record's ${lengths(ours)}; a frame lost at either end of a run cannot be known`
    );
  if (places.length > 1)
    return `${places.length} runs of the record's frames are of the same length, ${lengths(theirs)} periods`;
  const pairs: Pair[] = [];
  theirs.forEach((run, r) => {
    const byNumber = new Map(ours[places[0]! + r]!.map(({ index, number }) => [number, index]));
    for (const { index, number } of run) {
      const found = byNumber.get(number);
      if (found !== undefined) pairs.push({ ref: found, other: index });
    }
  });
  return pairs;
}

/** How often the frame clock ran. */
export function countRuns(times: readonly number[]): number {
  return runsOf(times).length;
}

type Run = readonly { readonly index: number; readonly number: number }[];
const lengthOf = (run: Run) => run.at(-1)!.number + 1;

function runsOf(times: readonly number[]): Run[] {
  const period = median(intervals(times));
  const runs: { index: number; number: number }[][] = [];
  for (let i = 0; i < times.length; i++) {
    const gap = i === 0 ? Number.POSITIVE_INFINITY : (times[i]! - times[i - 1]!) / period;
    if (gap > PAUSE) runs.push([{ index: i, number: 0 }]);
    else {
      const run = runs.at(-1)!;
      // Counted from frame to frame: a whole run's rounding would gather the period's own error.
      run.push({ index: i, number: run.at(-1)!.number + Math.max(1, Math.round(gap)) });
    }
  }
  return runs;
}

function intervals(times: readonly number[]): number[] {
  return times.slice(1).map((time, i) => time - times[i]!);
}
