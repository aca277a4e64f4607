/** Board time is microseconds in 32 bits; the host counts on in a double, exact to 2^53. */

/**
 * Extends a 32-bit reading to the value nearest to `previous`: the one place where board time and
 * belt counts are unwrapped. Right while less than 2^31 (35.8 min of microseconds) lies between.
 */
export function extend32(previous: number, raw: number): number {
  return previous + ((raw - previous) | 0);
}

/** The extended time of a frame that carries the board's own count of wraps. */
export function fromWraps(wraps: number, raw: number): number {
  return wraps * 0x1_0000_0000 + (raw >>> 0);
}
