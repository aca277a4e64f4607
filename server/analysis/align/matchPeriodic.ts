import { type FrameRun, type FrameRuns, frameRuns } from './frameRuns.js';
import type { Pair, Why } from './matchRandom.js';
import { median } from './robustLine.js';

/** Most of the intervals lie this close to the usual one: a frame clock, no random train. */
const REGULAR = 0.02;
/** A run that begins or ends this near to the recording's own edge may go on beyond it. */
const NEAR = 1.5;
/** Pauses agree to so many periods, and to this share, by which two clocks may differ. */
const PAUSE_PERIODS = 1.5;
const PAUSE_SHARE = 4e-4;

/** From when to when the edges of ours were recorded, in their seconds. */
export interface Window {
  readonly fromS: number;
  readonly toS: number;
}

/** True for a frame clock: intervals say nothing there, only counts and pauses do. */
export function isPeriodic(times: readonly number[]): boolean {
  if (times.length < 4) return false;
  const gaps = times.slice(1).map((time, i) => time - times[i]!);
  const usual = median(gaps);
  return median(gaps.map((gap) => Math.abs(gap - usual))) < REGULAR * usual;
}

/** How often the frame clock ran. */
export function countRuns(times: readonly number[]): number {
  return frameRuns(times).runs.length;
}

/**
 * Matches a periodic frame clock by counting. The other's runs of frames are laid over ours where the
 * runs have the same lengths and the pauses between them agree, and refused where none or several do.
 * A run that a recording began too late for, or stopped too early, is counted from its other end;
 * that it was cut is known from the recording's own edge, or from a pause beside it.
 * @param options.only compare with this run of ours alone, from 0: acquisitions known in order
 * @param options.window of our recording; without it no run of ours is taken to be cut
 */
export function matchPeriodic(
  ref: readonly number[],
  other: readonly number[],
  options: { readonly only?: number | undefined; readonly window?: Window | undefined } = {},
): Pair[] | Why {
  if (other.length < 2) return `it has ${other.length} edges, too few to count frames by`;
  const ours = frameRuns(ref);
  const theirs = frameRuns(other);
  const cut = {
    ourStart: nearStart(ours, options.window?.fromS),
    ourEnd: nearEnd(ours, options.window?.toS),
    // Times of an acquisition mostly count from its own beginning.
    theirStart: nearStart(theirs, 0),
  };
  const found: { readonly at: number; readonly shifts: readonly number[] }[] = [];
  for (let at = 0; at + theirs.runs.length <= ours.runs.length; at++) {
    if (options.only !== undefined && at !== options.only) continue;
    const shifts = layOver(ours, theirs, at, cut);
    if (shifts !== undefined) found.push({ at, shifts });
  }
  const lengths = (runs: readonly FrameRun[]) => runs.map(({ length }) => length).join(', ');
  if (found.length === 0)
    return (
      `no run of the record's frames is as long: theirs ${lengths(theirs.runs)} periods, ` +
      `the record's ${lengths(ours.runs)}; a frame lost at either end of a run cannot be known`
    );
  if (found.length > 1)
    return `${found.length} runs of the record's frames are of the same length, ${lengths(theirs.runs)} periods`;
  const { at, shifts } = found[0]!;
  const pairs: Pair[] = [];
  theirs.runs.forEach((run, r) => {
    const byNumber = new Map(
      ours.runs[at + r]!.frames.map(({ index, number }) => [number, index] as const),
    );
    for (const { index, number } of run.frames) {
      const ref = byNumber.get(number + shifts[r]!);
      if (ref !== undefined) pairs.push({ ref, other: index });
    }
  });
  return pairs;
}

interface Cut {
  readonly ourStart: boolean;
  readonly ourEnd: boolean;
  readonly theirStart: boolean;
}

/** What to add to the numbers of each of their runs to have ours; undefined where they do not fit. */
function layOver(ours: FrameRuns, theirs: FrameRuns, at: number, cut: Cut): number[] | undefined {
  const several = theirs.runs.length > 1;
  const shifts: number[] = [];
  for (const [r, their] of theirs.runs.entries()) {
    const our = ours.runs[at + r]!;
    if (r > 0 && !pausesAgree(ours, theirs, at, r)) return undefined;
    const longer = our.length - their.length;
    const [first, last] = [r === 0, r === theirs.runs.length - 1];
    // The shorter one was cut. With several runs a pause on the other side holds it in place.
    const byEnd = longer > 0 ? first && (cut.theirStart || several) : at + r === 0 && cut.ourStart;
    const byStart = longer > 0 ? last && several : at + r === ours.runs.length - 1 && cut.ourEnd;
    if (longer === 0) shifts.push(0);
    else if (byEnd && !byStart) shifts.push(longer);
    else if (byStart && !byEnd) shifts.push(0);
    else return undefined;
  }
  return shifts;
}

/** The pause before run `r` of theirs is as long as that of ours. */
function pausesAgree(ours: FrameRuns, theirs: FrameRuns, at: number, r: number): boolean {
  const pause = ({ runs, periodS }: FrameRuns, before: number) =>
    (runs[before]!.firstS - runs[before - 1]!.lastS) / periodS;
  const [a, b] = [pause(ours, at + r), pause(theirs, r)];
  return Math.abs(a - b) <= PAUSE_PERIODS + PAUSE_SHARE * a;
}

function nearStart({ runs, periodS }: FrameRuns, fromS: number | undefined): boolean {
  if (fromS === undefined || runs.length === 0) return false;
  const after = runs[0]!.firstS - fromS;
  return after >= 0 && after < NEAR * periodS;
}

function nearEnd({ runs, periodS }: FrameRuns, toS: number | undefined): boolean {
  if (toS === undefined || runs.length === 0) return false;
  const before = toS - runs.at(-1)!.lastS;
  return before >= 0 && before < NEAR * periodS;
}
