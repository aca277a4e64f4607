/** How many ids below the highest are remembered one by one. */
export const ID_WINDOW = 64;

/** Which ids were acted on under this tag: the highest, and a bitmap of the 64 below it. */
export class SeenIds {
  /** 0: none yet; 0 is no id. */
  #highest = 0;
  /** Bit n: id `highest - 1 - n` was seen. */
  #low = 0;
  #high = 0;

  clear(): void {
    this.#highest = 0;
    this.#low = 0;
    this.#high = 0;
  }

  /** Marks the id. @returns `new`, `seen`, or `old`: too far below to know */
  take(id: number): 'new' | 'seen' | 'old' {
    if (id > this.#highest) {
      this.#shift(id - this.#highest);
      this.#highest = id;
      return 'new';
    }
    if (id === this.#highest) return 'seen';
    const bit = this.#highest - 1 - id;
    if (bit >= ID_WINDOW) return 'old';
    const mask = 1 << (bit & 31);
    if (bit < 32) {
      if (this.#low & mask) return 'seen';
      this.#low |= mask;
    } else {
      if (this.#high & mask) return 'seen';
      this.#high |= mask;
    }
    return 'new';
  }

  /** The highest moves up by `by`; the former highest (if there was one) becomes bit `by - 1`. */
  #shift(by: number): void {
    const had = this.#highest !== 0;
    if (by > ID_WINDOW) {
      this.#low = 0;
      this.#high = 0;
      return;
    }
    let bits = (BigInt(this.#high >>> 0) << 32n) | BigInt(this.#low >>> 0);
    bits <<= BigInt(by);
    if (had) bits |= 1n << BigInt(by - 1);
    this.#low = Number(bits & 0xffff_ffffn) | 0;
    this.#high = Number((bits >> 32n) & 0xffff_ffffn) | 0;
  }
}
