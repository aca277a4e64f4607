import type { ArmRequest } from '../../rules/instant.js';
import type { LiveId } from './ledger.js';

/** One of the board's slots, from arming until its id's end is reported. */
interface Slot {
  live: LiveId;
  readonly request: ArmRequest;
  /** Its bit is set in the beat's mask. */
  wanted: boolean;
  lowByte: number;
  /** When it was asked of the board, extended board time. */
  readonly sinceUs: number;
}

/**
 * Which slots of the board are taken, by whom, and which the next beat still wants. A slot is not
 * used again before the end of its id has been reported.
 */
export class Armory {
  #slots: (Slot | undefined)[] = [];
  #wantedMask = 0;
  /** The mask changed since the last beat: the next one goes out at once. */
  changed = false;

  /** Slots that the board offers; all free. For a new connection, whose tag ended every slot. */
  reset(slots: number): void {
    this.#slots = new Array(Math.min(slots, 32)).fill(undefined);
    this.#wantedMask = 0;
    this.changed = false;
  }

  /** Bit n: slot n is still wanted. */
  get wantedMask(): number {
    return this.#wantedMask;
  }

  /** A slot that is free, or -1. */
  free(): number {
    return this.#slots.indexOf(undefined);
  }

  /**
   * The count nearest to `count`, going in the armed direction, whose low byte no taken slot has:
   * the board's interrupt looks slots up by that byte, and one count is a fraction of a millimetre.
   */
  clearCount(count: number, step: 1 | -1): number {
    let clear = count;
    while (this.#slots.some((slot) => slot?.lowByte === (clear & 0xff))) clear += step;
    return clear;
  }

  take(index: number, live: LiveId, request: ArmRequest, count: number, sinceUs: number): void {
    this.#slots[index] = { live, request, wanted: true, lowByte: count & 0xff, sinceUs };
    this.#setWanted(index, true);
  }

  /** The slot's id has ended. */
  release(live: LiveId): void {
    const index = this.#slots.findIndex((slot) => slot?.live === live);
    if (index < 0) return;
    this.#slots[index] = undefined;
    this.#setWanted(index, false);
  }

  /** The wanted slot of a rule. */
  ofRule(rule: number): LiveId | undefined {
    return this.#slots.find((slot) => slot?.wanted && slot.request.rule === rule)?.live;
  }

  /** Since when the rule's wanted slot has been asked of the board; NaN without one. */
  sinceUs(rule: number): number {
    const slot = this.#slots.find((one) => one?.wanted && one.request.rule === rule);
    return slot?.sinceUs ?? Number.NaN;
  }

  /** The rule has a slot whose end has not been reported, wanted or not. */
  holds(rule: number): boolean {
    return this.#slots.some((slot) => slot?.request.rule === rule);
  }

  /** The next beat leaves the rule's slot out, and the board clears it. */
  unwant(rule: number): LiveId | undefined {
    const index = this.#slots.findIndex((slot) => slot?.wanted && slot.request.rule === rule);
    if (index < 0) return undefined;
    const slot = this.#slots[index]!;
    slot.wanted = false;
    this.#setWanted(index, false);
    return slot.live;
  }

  unwantAll(): void {
    for (let index = 0; index < this.#slots.length; index++) {
      const slot = this.#slots[index];
      if (slot) slot.wanted = false;
      this.#setWanted(index, false);
    }
  }

  #setWanted(index: number, wanted: boolean): void {
    const bit = 1 << index;
    const mask = wanted ? this.#wantedMask | bit : this.#wantedMask & ~bit;
    if (mask === this.#wantedMask) return;
    this.#wantedMask = mask;
    this.changed = true;
  }
}
