/** Further than any move: no slot in that direction. */
export const NO_SLOT = 0x7fff_ffff;

export interface Slot {
  armed: boolean;
  id: number;
  output: number;
  rising: boolean;
  /** Signed 32 bits, as the count. */
  target: number;
  widthUs: number;
  periodUs: number;
  repeats: number;
}

/** The armed slots, and the nearest target each way, so that many counts can pass in one step. */
export class SlotTable {
  readonly slots: readonly Slot[];
  #up = 0;
  #hasUp = false;
  #down = 0;
  #hasDown = false;
  #leftBehind = 0;

  constructor(size: number) {
    this.slots = Array.from({ length: size }, () => ({
      armed: false,
      id: 0,
      output: 0,
      rising: true,
      target: 0,
      widthUs: 0,
      periodUs: 0,
      repeats: 0,
    }));
  }

  /** Armed slots whose target is not ahead any more; only counts that were skipped leave any. */
  get leftBehind(): number {
    return this.#leftBehind;
  }

  /** Counts from `count` up to the nearest rising target, at least 1; `NO_SLOT` without one. */
  upFrom(count: number): number {
    const gap = this.#hasUp ? (this.#up - count) | 0 : NO_SLOT;
    return gap > 0 ? gap : NO_SLOT;
  }

  /** Counts from `count` down to the nearest falling target, at least 1. */
  downFrom(count: number): number {
    const gap = this.#hasDown ? (count - this.#down) | 0 : NO_SLOT;
    return gap > 0 ? gap : NO_SLOT;
  }

  /** Another slot whose target has the same low byte: the interrupt looks slots up by it. */
  sharesLowByte(target: number): boolean {
    for (const slot of this.slots) {
      if (slot.armed && ((slot.target ^ target) & 0xff) === 0) return true;
    }
    return false;
  }

  /** Call after arming or clearing slots, and after the count was moved without comparing. */
  refresh(count: number): void {
    this.#hasUp = false;
    this.#hasDown = false;
    this.#leftBehind = 0;
    for (const slot of this.slots) {
      if (!slot.armed) continue;
      const ahead = slotAhead(slot, count);
      if (ahead <= 0) {
        this.#leftBehind++;
        continue;
      }
      if (slot.rising) {
        if (!this.#hasUp || ahead < ((this.#up - count) | 0)) this.#up = slot.target;
        this.#hasUp = true;
      } else {
        if (!this.#hasDown || ahead < ((count - this.#down) | 0)) this.#down = slot.target;
        this.#hasDown = true;
      }
    }
  }
}

/** Counts still to go in the slot's own direction; 0 or less: not ahead any more. */
export function slotAhead(slot: Slot, count: number): number {
  return slot.rising ? (slot.target - count) | 0 : (count - slot.target) | 0;
}
