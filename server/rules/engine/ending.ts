import { Pace } from './pace.js';
import type { Run } from './run.js';
import { TRUE } from './truth.js';

/** The end announces itself this far ahead; where no lap has shown a pace yet, by the time alone. */
export const ANNOUNCED_LAPS = 5;
const ANNOUNCED_US = 300_000_000;
/** What is foreseen by time is looked at this often between laps. */
const LOOK_US = 5_000_000;
/** The most that one session's end may be put off, in all. */
export const MOST_PUT_OFF_LAPS = 25;
export const MOST_PUT_OFF_MIN = 25;
const US_PER_MIN = 60_000_000;

/** What is known of the session's end. */
export interface Foreseen {
  /** Laps left, the present one counted in; NaN while no pace is known. */
  readonly laps: number;
  /** Time left, microseconds, where a time ends it; NaN otherwise. */
  readonly us: number;
  /** Reckoned in laps alone, and not by the pace so far. */
  readonly exact: boolean;
  /** What ends it, in words. */
  readonly what: string;
}

/** When the session ends by itself: foreseen, announced, put off. The operator's own end does not wait. */
export class Ending {
  /** Foreseen from the laps so far. */
  readonly pace: Pace;
  private putOffLaps = 0;
  private putOffUs = 0;
  /** Where and when an end came true first. */
  private dueLap = Number.NaN;
  private dueUs = Number.NaN;
  private dueReason = '';
  private announced = false;
  /** It was told in laps: what was told by the time alone is told once more when laps are near. */
  private announcedLaps = false;
  private lookUs = Number.NEGATIVE_INFINITY;

  constructor(private readonly run: Run) {
    this.pace = new Pace(run.s);
  }

  get putOffSoFar(): { readonly laps: number; readonly minutes: number } {
    return { laps: this.putOffLaps, minutes: this.putOffUs / US_PER_MIN };
  }

  /** @returns false beyond what one session may be put off */
  putOff(laps: number, minutes: number): boolean {
    const whole = Number.isInteger(laps) && Number.isInteger(minutes);
    if (!whole || laps < 0 || minutes < 0 || laps + minutes === 0) return false;
    if (this.putOffLaps + laps > MOST_PUT_OFF_LAPS) return false;
    if (this.putOffUs / US_PER_MIN + minutes > MOST_PUT_OFF_MIN) return false;
    this.putOffLaps += laps;
    this.putOffUs += minutes * US_PER_MIN;
    // It announces itself again.
    this.announced = false;
    this.announcedLaps = false;
    this.lookUs = Number.NEGATIVE_INFINITY;
    return true;
  }

  /** An end has come true. @returns whether it is to be obeyed now */
  isDue(reason: string): boolean {
    const { s } = this.run;
    if (Number.isNaN(this.dueLap)) {
      this.dueLap = s.lap;
      this.dueUs = s.nowUs;
      this.dueReason = reason;
    }
    return s.lap >= this.dueLap + this.putOffLaps && s.nowUs >= this.dueUs + this.putOffUs;
  }

  /** A phase begins: the last one is not over any more. */
  phaseBegan(): void {
    if (this.dueReason !== ITS_END) this.dueLap = Number.NaN;
    this.announced = false;
    this.announcedLaps = false;
    this.lookUs = Number.NEGATIVE_INFINITY;
    this.pace.phaseBegan();
  }

  /** At the end of each instant. */
  step(lapBegan: boolean): void {
    const { run } = this;
    const { s } = run;
    const { end } = s.program;
    const latched = !Number.isNaN(this.dueLap);
    if (latched ? this.isDue('') : end !== undefined && end(s) === TRUE && this.isDue(ITS_END)) {
      run.requestEnd(this.dueReason);
      return;
    }
    if (lapBegan) this.pace.lapBegan();
    if (!lapBegan && s.nowUs < this.lookUs) return;
    this.lookUs = s.nowUs + LOOK_US;
    if (!this.announcedLaps) this.announce();
  }

  private announce(): void {
    const found = this.foreseen();
    if (found === undefined) return;
    const paced = !Number.isNaN(found.laps);
    const near = paced ? found.laps <= ANNOUNCED_LAPS : found.us <= ANNOUNCED_US && !this.announced;
    if (!near) return;
    this.announced = true;
    this.announcedLaps = paced;
    this.run.journal.endForeseen(found.laps, found.us, found.exact, found.what);
  }

  /** The end that comes first, what was put off counted in; undefined where none can be foreseen. */
  foreseen(): Foreseen | undefined {
    const { s } = this.run;
    const { putOffLaps, putOffUs, pace } = this;
    if (!Number.isNaN(this.dueLap)) {
      const laps = this.dueLap + putOffLaps - s.lap;
      const us = this.dueUs + putOffUs - s.nowUs;
      const byTime = us > 0 ? Math.ceil(us / pace.lapUs) : 0;
      const exact = putOffUs === 0;
      return {
        laps: Math.max(laps, byTime),
        us: putOffUs > 0 ? us : NaN,
        exact,
        what: this.dueReason,
      };
    }
    const last = s.phase >= 0 && s.phase === s.program.phases.length - 1;
    const ends = [s.program.endAhead, last ? s.program.phases[s.phase]!.ahead : undefined];
    const found = pace.nearest(ends.flatMap((ahead) => (ahead === undefined ? [] : [ahead])));
    if (found === undefined) return undefined;
    const later = putOffUs > 0 ? Math.ceil(putOffUs / pace.lapUs) : 0;
    return {
      laps: found.laps + Math.max(putOffLaps, later),
      us: found.us + putOffUs,
      exact: found.exact && putOffUs === 0,
      what: found.what,
    };
  }
}

const ITS_END = 'its `end` is true';
