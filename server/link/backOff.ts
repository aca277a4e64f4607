const FIRST_MS = 100;
const MOST_MS = 2_000;

/** How long to wait before trying again: 100 ms, doubling to 2 s; anew after a success. */
export class BackOff {
  #nextMs = FIRST_MS;

  next(): number {
    const wait = this.#nextMs;
    this.#nextMs = Math.min(MOST_MS, wait * 2);
    return wait;
  }

  reset(): void {
    this.#nextMs = FIRST_MS;
  }
}
