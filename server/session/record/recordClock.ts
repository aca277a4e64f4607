import { extend32, fromWraps } from '../../wire/time.js';
import type { RareInput } from '../inputs.js';

/** Where a clock stood, so that a resumed recording goes on from there. */
export interface ClockPoint {
  /** Microseconds of session; never falls. */
  readonly sessionUs: number;
  /** Extended board time, and what to add to it for session time. */
  readonly boardUs: number;
  readonly offsetUs: number;
  /** The board's boot the times belong to; null before any is known. */
  readonly bootId: number | null;
}

/**
 * The record's log time: microseconds of board time since the session's first stamped input. It
 * never falls, and a board that restarts goes on from where the last one stopped.
 */
export class RecordClock {
  #sessionUs = 0;
  #boardUs = 0;
  #offsetUs = 0;
  #bootId: number | null = null;
  #begun = false;
  readonly #hostUs: (() => number) | undefined;

  /**
   * `hostUs` is the host's time since the session began: asked only when another board boot takes
   * over, for how long the silence was. Without it the silence counts as nothing.
   */
  constructor(from: ClockPoint | undefined, hostUs?: () => number) {
    this.#hostUs = hostUs;
    if (from === undefined) return;
    this.#sessionUs = from.sessionUs;
    this.#boardUs = from.boardUs;
    this.#offsetUs = from.offsetUs;
    this.#bootId = from.bootId;
    this.#begun = true;
  }

  get sessionUs(): number {
    return this.#sessionUs;
  }

  point(): ClockPoint | undefined {
    if (!this.#begun) return undefined;
    return {
      sessionUs: this.#sessionUs,
      boardUs: this.#boardUs,
      offsetUs: this.#offsetUs,
      bootId: this.#bootId,
    };
  }

  /** Moves on to a raw 32-bit stamp of the board. */
  raw(boardUs: number): void {
    if (this.#begun) this.#reach(extend32(this.#boardUs, boardUs));
    else this.#begin(boardUs >>> 0);
  }

  /** Moves on to the stamp of any other input; one without a stamp leaves time where it is. */
  input(input: RareInput): void {
    switch (input.kind) {
      case 'clock':
        if (this.#begun) this.#whole(fromWraps(input.message.wraps, input.message.boardUs));
        else this.#begin(fromWraps(input.message.wraps, input.message.boardUs));
        break;
      case 'edge':
      case 'fault':
        this.raw(input.message.boardUs);
        break;
      case 'outcome':
        // A repeated outcome tells of the past, perhaps of another boot.
        if (input.message.repeated === 0) this.raw(input.message.boardUs);
        break;
      case 'link up': {
        const { bootId, wraps, boardUs } = input.identity;
        const now = fromWraps(wraps, boardUs);
        if (!this.#begun) this.#begin(now);
        else if (this.#bootId === null || this.#bootId === bootId) this.#whole(now);
        else {
          const host = this.#hostUs?.() ?? 0;
          this.#boardUs = now;
          this.#sessionUs = Math.max(this.#sessionUs, Math.floor(host));
          this.#offsetUs = this.#sessionUs - now;
        }
        this.#bootId = bootId;
        break;
      }
    }
  }

  #begin(boardUs: number): void {
    this.#begun = true;
    this.#boardUs = boardUs;
    this.#offsetUs = this.#sessionUs - boardUs;
  }

  /**
   * A stamp with its wraps. Until one is seen, extended time starts at the first raw stamp, so the
   * first may show that wraps were left out: they are no time that passed.
   */
  #whole(boardUs: number): void {
    const behind = boardUs - extend32(this.#boardUs, boardUs % 0x1_0000_0000);
    if (behind !== 0 && this.#bootId === null) {
      this.#boardUs += behind;
      this.#offsetUs -= behind;
    }
    this.#reach(boardUs);
  }

  #reach(boardUs: number): void {
    this.#boardUs = boardUs;
    const now = boardUs + this.#offsetUs;
    if (now > this.#sessionUs) this.#sessionUs = now;
  }
}
