import type { BeltParameters } from './belt.js';
import { Dice } from './dice.js';

/**
 * The mark on the belt as the sensor sees it: active over `[markCm, markCm + width)` of every lap,
 * from whichever side it comes. Keeps the next boundary each way, so that most steps cost two
 * comparisons.
 */
export class SeamMark {
  /** Unrolled cm of the next boundary above and below the belt's place. */
  upCm = Number.POSITIVE_INFINITY;
  downCm = Number.NEGATIVE_INFINITY;
  readonly #parameters: BeltParameters;
  readonly #dice: Dice;
  /** Stretches of belt, counted: even ones are marks, odd ones lie between two marks. */
  #stretch: number;
  #missing = false;

  constructor(parameters: BeltParameters, travelCm: number, seed: number) {
    this.#parameters = parameters;
    this.#dice = new Dice(seed);
    const { lengthCm, markCm, markWidthCm } = parameters;
    const lap = Math.floor((travelCm - markCm) / lengthCm);
    const inside = travelCm < lap * lengthCm + markCm + markWidthCm;
    this.#stretch = 2 * lap + (inside ? 0 : 1);
    this.#look();
  }

  /** What the sensor shows at rest. */
  get level(): 0 | 1 {
    return this.#parameters.mark && this.#inside && !this.#missing ? 1 : 0;
  }

  /** The belt has just crossed a boundary, forwards or back. @returns true when the sensor saw it */
  cross(forwards: boolean): boolean {
    const wasMissing = this.#missing;
    this.#stretch += forwards ? 1 : -1;
    this.#look();
    if (!this.#inside) {
      this.#missing = false;
      return !wasMissing;
    }
    this.#missing = this.#dice.chance(this.#parameters.markMissChance);
    return !this.#missing;
  }

  /** Microseconds after the edge at which an extra change comes, for each bounce. */
  bounceUs(): number {
    return 1 + Math.floor(this.#dice.unit() * this.#parameters.bounceMostUs);
  }

  get #inside(): boolean {
    return this.#stretch % 2 === 0;
  }

  #look(): void {
    if (!this.#parameters.mark) return;
    this.downCm = this.#boundary(this.#stretch);
    this.upCm = this.#boundary(this.#stretch + 1);
  }

  /** Where a stretch begins, seen along the belt's forward direction. */
  #boundary(stretch: number): number {
    const { lengthCm, markCm, markWidthCm } = this.#parameters;
    const lap = Math.floor(stretch / 2);
    return lap * lengthCm + markCm + (stretch % 2 === 0 ? 0 : markWidthCm);
  }
}
