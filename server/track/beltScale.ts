/**
 * Counts and centimetres of one belt. A lap is the belt's length rounded to a whole count, so that
 * every comparison of travel is exact; what rounding takes (half a count a lap at most) is less
 * than any calibration knows, and a seam mark takes it back each lap.
 */
export class BeltScale {
  readonly lapCounts: number;
  readonly cmPerCount: number;
  /** Travel at the start of the lap located last, so that most samples need no division. */
  #turn = 0;

  /** @throws RangeError for a lap of fewer than 16 counts */
  constructor(lengthCm: number, countsPerCm: number) {
    this.lapCounts = Math.round(lengthCm * countsPerCm);
    if (!(this.lapCounts >= 16)) {
      throw new RangeError(`a belt of ${this.lapCounts} counts a lap cannot be followed`);
    }
    this.cmPerCount = lengthCm / this.lapCounts;
  }

  /** Place along the belt, [0, length) cm. */
  positionCmOf(travelCounts: number): number {
    const turns = Math.floor(travelCounts / this.lapCounts);
    return (travelCounts - turns * this.lapCounts) * this.cmPerCount;
  }

  /** Sets the position at `travelCounts`: as a result it would go to the heap at every sample. */
  locate(travelCounts: number, into: { positionCm: number }): void {
    let counts = travelCounts - this.#turn;
    if (counts < 0 || counts >= this.lapCounts) {
      this.#turn = Math.floor(travelCounts / this.lapCounts) * this.lapCounts;
      counts = travelCounts - this.#turn;
    }
    into.positionCm = counts * this.cmPerCount;
  }

  /** Travel at `placeCm` of lap `lap`, counts; not a whole number as a rule. */
  travelOf(lap: number, placeCm: number): number {
    return lap * this.lapCounts + placeCm / this.cmPerCount;
  }
}
