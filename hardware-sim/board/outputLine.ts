import { CONFIGURE_FLAG, type Configure, REASON } from '../../server/wire/messages.js';
import { Xorshift32 } from './xorshift.js';

/** A pulse or a train; times in microseconds. */
export interface Shape {
  readonly widthUs: number;
  /** Rise to rise; without meaning when there is one pulse. */
  readonly periodUs: number;
  readonly repeats: number;
}

/** What owns an output: nobody, a command with an id, or a sync train. */
export type Owner = 'none' | 'command' | 'sync';

const NEVER = Number.POSITIVE_INFINITY;

/**
 * One output: its level, its owner, its limits, and when it changes next. Times are the board's own
 * microseconds, extended. It knows nothing of messages; `Board` tells the outcomes.
 */
export class OutputLine {
  on = false;
  owner: Owner = 'none';
  id = 0;
  /** Why the owner's end was brought forward; `none` while it runs its course. */
  ending: number = REASON.none;
  /** On for this owner so far, finished pulses only. */
  onUs = 0;
  idleHigh = false;
  finishOnSilence = false;
  /** 0: not configured, never on. */
  longestOnUs = 0;

  #leastGapUs = 0;
  #leastCounts = 0;
  #allowanceUs = 0;
  #allowanceRises = 0;

  #riseUs = 0;
  #widthUs = 0;
  #periodUs = 0;
  #left = 0;
  #fallAtUs = NEVER;
  /** The cut-off, reckoned apart from the pulse's own end. */
  #cutAtUs = NEVER;
  #riseAtUs = NEVER;
  #lastFallUs = -NEVER;
  #firstRiseCount: number | undefined;
  /** What this pulse took from the allowance, to give back when it is cut short. */
  #takenUs = 0;

  #random: Xorshift32 | undefined;
  #leastWaitUs = 0;
  #mostWaitUs = 0;

  /** When this output next needs `Board`'s attention. */
  get nextUs(): number {
    return this.on ? Math.min(this.#fallAtUs, this.#cutAtUs) : this.#riseAtUs;
  }

  /** Takes new limits, in force at once. `Board` ends the owner first when they forbid it. */
  configure(message: Configure): void {
    this.idleHigh = (message.flags & CONFIGURE_FLAG.idleHigh) !== 0;
    this.finishOnSilence = (message.flags & CONFIGURE_FLAG.finishOnSilence) !== 0;
    this.longestOnUs = message.longestOnUs;
    this.#leastGapUs = message.leastGapUs;
    this.#leastCounts = message.leastCounts;
    this.#allowanceUs = message.allowanceUs;
    this.#allowanceRises = message.allowanceRises;
    this.#takenUs = 0;
    // Only ever sooner: what a pulse was allowed when it rose is the most that it gets.
    if (this.on) this.#cutAtUs = Math.min(this.#cutAtUs, this.#riseUs + this.longestOnUs);
  }

  /** Back to "never", but for the idle level; a pulse on its way keeps its own cut-off. */
  unconfigure(): void {
    this.longestOnUs = 0;
    this.#allowanceUs = 0;
    this.#allowanceRises = 0;
    this.#takenUs = 0;
  }

  /** As at reset: idle, unowned, without limits or memory. */
  reset(): void {
    this.release();
    this.on = false;
    this.idleHigh = false;
    this.finishOnSilence = false;
    this.unconfigure();
    this.#leastGapUs = 0;
    this.#leastCounts = 0;
    this.#lastFallUs = -NEVER;
    this.#firstRiseCount = undefined;
  }

  /** What is wrong with a shape by itself: the checks made when a command arrives. */
  shapeReason(shape: Shape): number {
    if (this.longestOnUs === 0) return REASON.notConfigured;
    if (shape.widthUs < 1 || shape.repeats < 1) return REASON.badShape;
    if (shape.repeats > 1 && shape.periodUs <= shape.widthUs) return REASON.badShape;
    if (shape.widthUs > this.longestOnUs) return REASON.longestOn;
    if (shape.repeats > 1 && shape.periodUs - shape.widthUs < this.#leastGapUs) {
      return REASON.leastGap;
    }
    return REASON.none;
  }

  /** The checks made at a command's first rise; `none` when it may rise. */
  riseReason(shape: Shape, nowUs: number, count: number): number {
    const reason = this.shapeReason(shape);
    if (reason !== REASON.none) return reason;
    if (this.owner !== 'none') return REASON.busy;
    if (nowUs - this.#lastFallUs < this.#leastGapUs) return REASON.leastGap;
    if (
      this.#firstRiseCount !== undefined &&
      Math.abs((count - this.#firstRiseCount) | 0) < this.#leastCounts
    ) {
      return REASON.leastCounts;
    }
    if (shape.repeats > this.#allowanceRises || shape.widthUs * shape.repeats > this.#allowanceUs) {
      return REASON.allowance;
    }
    return REASON.none;
  }

  /** The first rise of a command that `riseReason` agreed to. */
  begin(id: number, shape: Shape, nowUs: number, count: number): void {
    this.owner = 'command';
    this.id = id;
    this.ending = REASON.none;
    this.onUs = 0;
    this.#widthUs = shape.widthUs;
    this.#periodUs = shape.periodUs;
    this.#left = shape.repeats;
    this.#firstRiseCount = count;
    this.#rise(nowUs);
  }

  /** The next rise of a train: `none`, or why the train must end here. */
  riseAgain(nowUs: number): number {
    if (this.owner === 'sync') {
      this.#riseSync(nowUs);
      return REASON.none;
    }
    this.#riseAtUs = NEVER;
    if (this.longestOnUs === 0) return REASON.notConfigured;
    if (this.#widthUs > this.longestOnUs) return REASON.longestOn;
    if (nowUs - this.#lastFallUs < this.#leastGapUs) return REASON.leastGap;
    if (this.#allowanceRises < 1 || this.#widthUs > this.#allowanceUs) return REASON.allowance;
    this.#rise(nowUs);
    return REASON.none;
  }

  /** The output goes idle now. @returns true when the owner has nothing left to do */
  fall(nowUs: number): boolean {
    const tookUs = nowUs - this.#riseUs;
    if (nowUs >= this.#cutAtUs && nowUs < this.#fallAtUs && this.ending === REASON.none) {
      this.end(REASON.longestOn);
    }
    this.on = false;
    this.onUs += tookUs;
    this.#allowanceUs += Math.max(0, this.#takenUs - tookUs);
    this.#takenUs = 0;
    this.#lastFallUs = nowUs;
    this.#fallAtUs = NEVER;
    this.#cutAtUs = NEVER;
    if (this.owner === 'sync') {
      this.#riseAtUs = nowUs + this.#random!.between(this.#leastWaitUs, this.#mostWaitUs);
      return false;
    }
    if (this.#left === 0) return true;
    this.#riseAtUs = this.#riseUs + this.#periodUs;
    return false;
  }

  /** No further pulse after the one that may be on, and why. */
  end(reason: number): void {
    this.ending = reason;
    this.#left = 0;
    this.#riseAtUs = NEVER;
  }

  /** True while pulses of this train are still to come. */
  get moreToCome(): boolean {
    return this.#left > 0;
  }

  /** The owner lets go. */
  release(): void {
    this.owner = 'none';
    this.id = 0;
    this.#left = 0;
    this.#fallAtUs = NEVER;
    this.#cutAtUs = NEVER;
    this.#riseAtUs = NEVER;
    this.#random = undefined;
  }

  /** On for the owner in all, the pulse at hand included. */
  onSoFarUs(nowUs: number): number {
    return this.onUs + (this.on ? nowUs - this.#riseUs : 0);
  }

  /** May a sync train of this shape run here? */
  syncAllowed(widthUs: number, leastWaitUs: number, mostWaitUs: number): boolean {
    return (
      widthUs >= 1 &&
      widthUs <= this.longestOnUs &&
      leastWaitUs >= Math.max(1, this.#leastGapUs) &&
      mostWaitUs >= leastWaitUs &&
      mostWaitUs < 0x8000_0000
    );
  }

  /** Would this sync train break these limits? */
  syncForbidden(message: Configure): boolean {
    return (
      this.owner === 'sync' &&
      (this.#widthUs > message.longestOnUs || this.#leastWaitUs < message.leastGapUs)
    );
  }

  beginSync(widthUs: number, leastUs: number, mostUs: number, seed: number, nowUs: number): void {
    this.owner = 'sync';
    this.#widthUs = widthUs;
    this.#leastWaitUs = leastUs;
    this.#mostWaitUs = mostUs;
    this.#random = new Xorshift32(seed);
    // The first rise keeps the least gap to whatever was on this output before, as every other.
    this.#riseAtUs = nowUs + this.#random.between(leastUs, mostUs);
  }

  #rise(nowUs: number): void {
    this.#left--;
    this.#allowanceRises--;
    this.#allowanceUs -= this.#widthUs;
    this.#takenUs = this.#widthUs;
    this.#turnOn(nowUs, this.longestOnUs);
  }

  #riseSync(nowUs: number): void {
    this.#takenUs = 0;
    // A sync train outlives the limits of the connection that began it; its width was within them.
    this.#turnOn(nowUs, this.#widthUs);
  }

  #turnOn(nowUs: number, cutAfterUs: number): void {
    this.on = true;
    this.#riseUs = nowUs;
    this.#fallAtUs = nowUs + this.#widthUs;
    this.#cutAtUs = nowUs + cutAfterUs;
    this.#riseAtUs = NEVER;
  }
}
