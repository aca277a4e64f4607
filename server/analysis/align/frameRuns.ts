import { median } from './robustLine.js';

/** Frames between two pauses; the first is number 0. */
export interface FrameRun {
  readonly frames: readonly { readonly index: number; readonly number: number }[];
  /** Periods from its first frame to its last, and one. */
  readonly length: number;
  readonly firstS: number;
  readonly lastS: number;
}
export interface FrameRuns {
  readonly runs: readonly FrameRun[];
  readonly periodS: number;
}

/** A longer pause than this many periods ends a run of frames. */
const PAUSE = 5;
/** A frame comes within this share of a period of its time; what does not is no frame. */
const PHASE = 0.25;
/** So many edges at the beginning of a run may be spurious. */
const ANCHORS = 4;
/** Fewer frames than this in a row are spurious edges within a pause. */
const LEAST_FRAMES = 3;

/**
 * Numbers the frames of a periodic clock, in periods from the first of each run, so that a lost one
 * leaves a gap in the numbers and an edge in between is left out.
 * @param times rising, seconds; at least two
 */
export function frameRuns(times: readonly number[]): FrameRuns {
  const periodS = median(times.slice(1).map((time, i) => time - times[i]!));
  const runs: FrameRun[] = [];
  for (let from = 0; from < times.length; ) {
    let to = from + 1;
    while (to < times.length && times[to]! - times[to - 1]! <= PAUSE * periodS) to++;
    const run = numbered(times, from, to, periodS);
    if (run.frames.length >= LEAST_FRAMES || times.length < LEAST_FRAMES) runs.push(run);
    from = to;
  }
  return { runs, periodS };
}

/** The numbering, of those that begin at one of the first edges, that most edges agree with. */
function numbered(times: readonly number[], from: number, to: number, periodS: number): FrameRun {
  let best: FrameRun['frames'] = [];
  for (let first = from; first < Math.min(to, from + ANCHORS); first++) {
    const frames = [{ index: first, number: 0 }];
    for (let i = first + 1; i < to; i++) {
      const last = frames.at(-1)!;
      // Counted from frame to frame: a whole run's rounding would gather the period's own error.
      const periods = (times[i]! - times[last.index]!) / periodS;
      const whole = Math.round(periods);
      if (whole < 1 || Math.abs(periods - whole) > PHASE) continue;
      frames.push({ index: i, number: last.number + whole });
    }
    if (frames.length > best.length) best = frames;
  }
  const last = best.at(-1)!;
  return {
    ...{ frames: best, length: last.number + 1 },
    ...{ firstS: times[best[0]!.index]!, lastS: times[last.index]! },
  };
}
