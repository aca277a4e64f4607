import type { Pulse } from '../../server/wire/messages.js';

/** An accepted pulse whose start is still ahead; times extended. */
export interface WaitingPulse {
  waiting: boolean;
  order: number;
  id: number;
  output: number;
  flags: number;
  startUs: number;
  widthUs: number;
  periodUs: number;
  repeats: number;
  countFrom: number;
  countTo: number;
}

/** Pulses to start at a board time: a fixed number of places, as a small board has. */
export class WaitingPulses {
  readonly #places: readonly WaitingPulse[];
  #order = 0;
  /** The earliest start; Infinity when none waits. */
  nextUs = Number.POSITIVE_INFINITY;

  constructor(size: number) {
    this.#places = Array.from({ length: size }, () => ({
      waiting: false,
      order: 0,
      id: 0,
      output: 0,
      flags: 0,
      startUs: 0,
      widthUs: 0,
      periodUs: 0,
      repeats: 0,
      countFrom: 0,
      countTo: 0,
    }));
  }

  /** @returns false when every place is taken */
  add(pulse: Pulse, startUs: number): boolean {
    const place = this.#places.find((candidate) => !candidate.waiting);
    if (place === undefined) return false;
    place.waiting = true;
    place.order = this.#order++;
    place.id = pulse.id;
    place.output = pulse.output;
    place.flags = pulse.flags;
    place.startUs = startUs;
    place.widthUs = pulse.widthUs;
    place.periodUs = pulse.periodUs;
    place.repeats = pulse.repeats;
    place.countFrom = pulse.countFrom;
    place.countTo = pulse.countTo;
    this.#refresh();
    return true;
  }

  /** Takes out the one that is due, the first to have arrived when two share a start. */
  takeDue(nowUs: number): WaitingPulse | undefined {
    let due: WaitingPulse | undefined;
    for (const place of this.#places) {
      if (!place.waiting || place.startUs > nowUs) continue;
      if (
        due === undefined ||
        place.startUs < due.startUs ||
        (place.startUs === due.startUs && place.order < due.order)
      ) {
        due = place;
      }
    }
    if (due !== undefined) {
      due.waiting = false;
      this.#refresh();
    }
    return due;
  }

  /** Takes out every pulse for the outputs in `mask` and visits it. */
  clear(mask: number, visit: (pulse: WaitingPulse) => void): void {
    for (const place of this.#places) {
      if (!place.waiting || (mask & (1 << place.output)) === 0) continue;
      place.waiting = false;
      visit(place);
    }
    this.#refresh();
  }

  has(id: number): boolean {
    return this.#places.some((place) => place.waiting && place.id === id);
  }

  #refresh(): void {
    this.nextUs = Number.POSITIVE_INFINITY;
    for (const place of this.#places) {
      if (place.waiting && place.startUs < this.nextUs) this.nextUs = place.startUs;
    }
  }
}
