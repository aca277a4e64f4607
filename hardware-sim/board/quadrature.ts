/**
 * Quadrature decoding, four counts a cycle: A leading B is forward (+1). Index is
 * `previous A, previous B, A, B` as four bits; `ILLEGAL` is both lines changed at once, whose
 * direction cannot be known.
 */
export const ILLEGAL = 2;
export const TRANSITIONS = Int8Array.of(
  0,
  -1,
  1,
  ILLEGAL, //
  1,
  0,
  ILLEGAL,
  -1, //
  -1,
  ILLEGAL,
  0,
  1, //
  ILLEGAL,
  1,
  -1,
  0,
);

/** Remembers the two lines' levels and says what each new pair of levels means. */
export class QuadratureDecoder {
  #levels = 0;

  /** @returns -1, 0 or +1 counts, or `ILLEGAL` */
  next(a: 0 | 1, b: 0 | 1): number {
    const levels = (a << 1) | b;
    const step = TRANSITIONS[(this.#levels << 2) | levels]!;
    this.#levels = levels;
    return step;
  }
}
