import { extend32, fromWraps } from '../wire/time.js';

/**
 * Extended board time that never goes back, through wraps, a suspended host and a restarted board.
 *
 * While one boot lasts it is the board's own time counted on beyond 32 bits. A restarted board
 * begins again at zero; the host's time then goes on from where it was (how long the board was
 * dark it cannot know), and `toBoard` leads back to what the board's clock says.
 */
export class BoardClock {
  /** Extended time of the newest frame, microseconds. */
  nowUs = 0;
  /** Stamp of the frame at hand: at most `nowUs`, a little less for an edge that was overtaken. */
  stampUs = 0;
  #base = 0;
  #boardUs = 0;
  #known = false;

  /** Takes a frame's 32-bit stamp. @returns false when the frame is older than the newest one */
  take(raw: number): boolean {
    if (!this.#known) this.#begin(raw >>> 0);
    const boardUs = extend32(this.#boardUs, raw);
    this.stampUs = boardUs + this.#base;
    if (boardUs < this.#boardUs) return false;
    this.#boardUs = boardUs;
    this.nowUs = this.stampUs;
    return true;
  }

  /** Takes a stamp with the board's count of wraps: right however long nothing was heard. */
  takeWraps(wraps: number, raw: number): void {
    const boardUs = fromWraps(wraps, raw);
    if (!this.#known) this.#begin(boardUs);
    this.stampUs = boardUs + this.#base;
    if (boardUs <= this.#boardUs) return;
    this.#boardUs = boardUs;
    this.nowUs = this.stampUs;
  }

  /** Extended time of a stamp near now; takes nothing. */
  extend(raw: number): number {
    return extend32(this.#boardUs, raw) + this.#base;
  }

  /** What the board's own clock says at extended time `us` (to be sent modulo 2^32). */
  toBoard(us: number): number {
    return us - this.#base;
  }

  /** The board's clock has begun anew; the next stamp is taken as now. */
  restarted(): void {
    this.#known = false;
  }

  #begin(boardUs: number): void {
    // The first boot keeps the board's own time, later ones go on from the last instant.
    this.#base = this.nowUs === 0 ? 0 : this.nowUs - boardUs;
    this.#boardUs = boardUs;
    this.nowUs = boardUs + this.#base;
    this.#known = true;
  }
}
