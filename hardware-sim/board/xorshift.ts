/**
 * Xorshift, 32 bits, shifts 13, 17, 5 (G. Marsaglia, Journal of Statistical Software, 2003): small
 * enough for any board, and given exactly on the wire page so that a host can foretell a sync train.
 */
export class Xorshift32 {
  #state: number;

  /** A seed of 0 would stay 0 for ever: it is taken as 1. */
  constructor(seed: number) {
    this.#state = seed >>> 0 === 0 ? 1 : seed | 0;
  }

  /** The next number, 1 to 2^32 - 1. */
  next(): number {
    let x = this.#state;
    x ^= x << 13;
    x ^= x >>> 17;
    x ^= x << 5;
    this.#state = x;
    return x >>> 0;
  }

  /** From `least` to `most`, both possible: the high half of number times span. */
  between(least: number, most: number): number {
    return least + multiplyHigh(this.next(), most - least + 1);
  }
}

/** floor(a * b / 2^32) for unsigned 32-bit integers, exactly. */
export function multiplyHigh(a: number, b: number): number {
  const low = (a & 0xffff) * b;
  const high = (a >>> 16) * b;
  return Math.floor((high + Math.floor(low / 0x1_0000)) / 0x1_0000);
}
