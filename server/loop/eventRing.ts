import type { StampedDecision } from '../session/decisions.js';

/** The last events, by number from 1; older ones are in the record only. */
export class EventRing<T = StampedDecision> {
  readonly #events: { readonly number: number; readonly event: T }[] = [];
  readonly #capacity: number;
  #last = 0;

  constructor(capacity: number) {
    this.#capacity = capacity;
  }

  /** The number of the newest event; 0 before the first. */
  get last(): number {
    return this.#last;
  }

  /** The number of the oldest event still kept. */
  get first(): number {
    return Math.max(1, this.#last - this.#capacity + 1);
  }

  push(event: T): void {
    this.#last++;
    this.#events[this.#last % this.#capacity] = { number: this.#last, event };
  }

  /** At most `most` events after number `after`, oldest first; those no longer kept are left out. */
  after(after: number, most: number): { readonly number: number; readonly event: T }[] {
    const events: { readonly number: number; readonly event: T }[] = [];
    for (let n = Math.max(after + 1, this.first); n <= this.#last && events.length < most; n++) {
      events.push(this.#events[n % this.#capacity]!);
    }
    return events;
  }
}
