import type { Timer, Timers } from '../../server/link/timers.js';

/** A clock that stands still until it is told to go on, and lets promises settle at each step. */
export class VirtualTimers implements Timers {
  #now = 0;
  #serial = 0;
  readonly #due = new Map<number, { at: number; callback: () => void }>();

  now(): number {
    return this.#now;
  }

  set(delayMs: number, callback: () => void): Timer {
    const serial = ++this.#serial;
    this.#due.set(serial, { at: this.#now + Math.max(0, delayMs), callback });
    return serial;
  }

  clear(timer: Timer): void {
    this.#due.delete(timer as number);
  }

  /** Goes on by `ms`, calling what falls due in order of time. */
  async advance(ms: number): Promise<void> {
    const end = this.#now + ms;
    await settle();
    for (let next = this.#next(end); next !== undefined; next = this.#next(end)) {
      const [serial, { at, callback }] = next;
      this.#due.delete(serial);
      this.#now = at;
      callback();
      await settle();
    }
    this.#now = end;
    await settle();
  }

  #next(end: number) {
    let first: [number, { at: number; callback: () => void }] | undefined;
    for (const entry of this.#due) {
      if (entry[1].at <= end && (first === undefined || entry[1].at < first[1].at)) first = entry;
    }
    return first;
  }
}

/** Lets chains of promises that need no time run to their end. */
async function settle(): Promise<void> {
  for (let turn = 0; turn < 20; turn++) await Promise.resolve();
}
