import { AFTER_US, BEFORE_US, STEP_US } from './kernel.js';

/** A power of two that holds the window at one entry a step, and some more. */
const SIZE = 512;
const MASK = SIZE - 1;

/**
 * Where the belt was over the last four seconds, an entry each 10 ms: two columns in a ring that
 * never grows. Between entries the belt is taken to have moved evenly.
 */
export class PositionTrail {
  private readonly times = new Float64Array(SIZE);
  private readonly travels = new Float64Array(SIZE);
  private count = 0;

  /** Notes where the belt is. Times never go back. @param travel belt unrolled, in counts */
  note(nowUs: number, travel: number): void {
    if (this.count > 0 && nowUs - this.times[(this.count - 1) & MASK]! < STEP_US) return;
    this.times[this.count & MASK] = nowUs;
    this.travels[this.count & MASK] = travel;
    this.count++;
  }

  /** The belt has been placed anew: what was noted is on another scale. */
  clear(): void {
    this.count = 0;
  }

  /**
   * Where the belt was in the middle of each step of the window about `onsetUs`: travel into
   * `into`, NaN before the first entry and after the last.
   */
  about(onsetUs: number, into: Float64Array): void {
    const first = Math.max(0, this.count - SIZE);
    let next = first;
    for (let n = 0; n < into.length; n++) {
      const atUs = onsetUs - BEFORE_US + (n + 0.5) * STEP_US;
      while (next < this.count && this.times[next & MASK]! <= atUs) next++;
      into[n] = this.between(first, next, atUs);
    }
  }

  private between(first: number, next: number, atUs: number): number {
    if (next === first || next === this.count) return Number.NaN;
    const a = (next - 1) & MASK;
    const b = next & MASK;
    const share = (atUs - this.times[a]!) / (this.times[b]! - this.times[a]!);
    return this.travels[a]! + share * (this.travels[b]! - this.travels[a]!);
  }
}

/** Steps in the window. */
export const WINDOW_STEPS = (BEFORE_US + AFTER_US) / STEP_US;
