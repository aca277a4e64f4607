import type { OutputFacts } from '../rules/facts.js';
import { DutyWindow } from './dutyWindow.js';
import type { Reservation } from './reservation.js';
import { pulsesWords, timeWords } from './words.js';

/** What one output has done, may still be doing and is promised to do, against its limits. */
export class OutputAccount {
  readonly facts: OutputFacts;
  /** Rises done (shams too) and rises that nobody can account for. */
  rises = 0;
  uncertainRises = 0;
  readonly unsettled: Reservation[] = [];
  readonly #duty: DutyWindow | undefined;
  /** When the output fell last, at the latest. */
  #fellUs = Number.NEGATIVE_INFINITY;

  constructor(facts: OutputFacts) {
    this.facts = facts;
    const { duty } = facts;
    this.#duty = duty === undefined ? undefined : new DutyWindow(duty.share, duty.windowUs);
  }

  get reservedRises(): number {
    let rises = 0;
    for (const one of this.unsettled) rises += one.rises;
    return rises;
  }

  /** Left of the session's count; infinite without a limit. */
  get risesLeft(): number {
    const { perSession } = this.facts;
    if (perSession === undefined) return Number.POSITIVE_INFINITY;
    return Math.max(0, perSession - this.rises - this.uncertainRises - this.reservedRises);
  }

  /** Why `asked`, not yet among the unsettled, cannot be done; in words. */
  problem(asked: Reservation, nowUs: number): string | undefined {
    return (
      this.#shapeProblem(asked) ??
      this.#countProblem(asked) ??
      this.#gapProblem(asked) ??
      this.#dutyProblem(asked, nowUs)
    );
  }

  #shapeProblem(asked: Reservation): string | undefined {
    const { name, longestOnUs, leastGapUs } = this.facts;
    const whole =
      Number.isSafeInteger(asked.onUs) &&
      Number.isSafeInteger(asked.spanUs) &&
      Number.isInteger(asked.rises);
    if (!whole || asked.widthUs < 1 || asked.rises < 1) {
      return `${name}: not a pulse: ${asked.rises} times ${asked.widthUs} us`;
    }
    if (asked.widthUs > longestOnUs) {
      return `${name}: on for ${timeWords(asked.widthUs)} asked, ${timeWords(longestOnUs)} is its longest`;
    }
    const gapUs = asked.periodUs - asked.widthUs;
    if (asked.rises > 1 && (gapUs < 1 || gapUs < leastGapUs)) {
      return `${name}: ${timeWords(Math.max(0, gapUs))} between pulses asked, ${timeWords(leastGapUs)} is its least gap`;
    }
    return undefined;
  }

  #countProblem(asked: Reservation): string | undefined {
    const left = this.risesLeft;
    if (asked.rises <= left) return undefined;
    const { name, perSession } = this.facts;
    return `${name}: ${pulsesWords(asked.rises)} asked, ${left} left of ${perSession} for the session`;
  }

  /**
   * An order that starts in the host's own time must not meet another, nor come too soon after it.
   * One in a slot starts when the belt gets there: only the board can refuse it then, and does.
   */
  #gapProblem(asked: Reservation): string | undefined {
    if (asked.waits) return undefined;
    const { name, leastGapUs } = this.facts;
    if (asked.earliestUs < this.#fellUs + leastGapUs) {
      const agoUs = Math.max(0, asked.earliestUs - this.#fellUs);
      return `${name}: ${timeWords(agoUs)} after its last pulse, ${timeWords(leastGapUs)} is its least gap`;
    }
    for (const other of this.unsettled) {
      if (other.waits) continue;
      const after = asked.earliestUs >= other.endsByUs + leastGapUs;
      const before = asked.endsByUs + leastGapUs <= other.startsUs;
      if (!after && !before) return `${name}: busy with an earlier firing`;
    }
    return undefined;
  }

  /**
   * The worst case is that everything unsettled runs at once, back to back with this order. From
   * now on the output is on for at most one microsecond in each, so no window holds more than the
   * one that ends when this order's own on-time has run.
   */
  #dutyProblem(asked: Reservation, nowUs: number): string | undefined {
    const duty = this.#duty;
    if (duty === undefined) return undefined;
    duty.forget(nowUs - duty.windowUs);
    let onUs = duty.onSince(nowUs + asked.onUs - duty.windowUs);
    for (const other of this.unsettled) onUs += other.onUs;
    const leftUs = Math.max(0, duty.budgetUs - onUs);
    if (asked.onUs <= leftUs) return undefined;
    const { name } = this.facts;
    const window = `${timeWords(duty.budgetUs)} in any ${timeWords(duty.windowUs)}`;
    return `${name}: on for ${timeWords(asked.onUs)} asked, ${timeWords(leftUs)} left of ${window}`;
  }

  /** It ran: `onUs` in all, its last fall at `fellUs`. @returns its rises */
  done(one: Reservation, onUs: number, fellUs: number): number {
    const rises = Math.min(one.rises, Math.max(1, Math.ceil(onUs / one.widthUs)));
    this.rises += rises;
    this.#fell(fellUs);
    // A train whose first rise was never told is taken as late as it can have been.
    if (one.rises === 1 || Number.isNaN(one.firedUs)) this.#on(fellUs - onUs, onUs, onUs, onUs);
    else this.#on(one.firedUs, one.widthUs, one.periodUs, onUs);
    return rises;
  }

  /** It counts as if it had run as planned. */
  sham(one: Reservation): void {
    this.rises += one.rises;
    this.#fell(one.earliestUs + one.spanUs);
    this.#on(one.earliestUs, one.widthUs, one.periodUs, one.onUs);
  }

  /** It may have run, all of it over by `overUs`: counted in full and as late as can be. */
  uncertain(one: Reservation, overUs: number): void {
    this.uncertainRises += one.rises;
    this.#fell(overUs);
    this.#on(overUs, one.onUs, one.onUs, one.onUs);
  }

  /** On-time that no id stands for (a flush by hand). */
  charge(onUs: number, fellUs: number): void {
    this.rises++;
    this.#fell(fellUs);
    this.#on(fellUs - onUs, onUs, onUs, onUs);
  }

  #fell(us: number): void {
    if (us > this.#fellUs) this.#fellUs = us;
  }

  #on(startUs: number, widthUs: number, periodUs: number, onUs: number): void {
    if (onUs > 0) this.#duty?.add(startUs, widthUs, periodUs, onUs);
  }
}
