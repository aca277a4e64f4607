import { Dice } from './dice.js';
import type { AnimalParameters } from './parameters.js';

const NEVER = Number.POSITIVE_INFINITY;

/** When the tongue (or, in grooming, a paw) touches the lick sensor, and for how long. */
export class LickSensor {
  /** The next contact begins here, microseconds; Infinity: none planned. */
  nextUs = NEVER;
  /** The planned contact is the tongue's. */
  tongue = true;
  readonly #parameters: AnimalParameters;
  readonly #dice: Dice;
  #left = 0;
  #intervalUs = 0;
  #groomUntilUs = 0;
  #freeUs = 0;

  constructor(parameters: AnimalParameters, seed: number) {
    this.#parameters = parameters;
    this.#dice = new Dice(seed);
  }

  /** Plans so many licks from `fromUs`; licks already under way become as many as this. */
  begin(fromUs: number, licks: number): void {
    if (this.#left > 0 && this.tongue) {
      this.#left = Math.max(this.#left, licks);
      return;
    }
    const { slowestLickHz, fastestLickHz } = this.#parameters;
    this.tongue = true;
    this.#left = licks;
    this.#intervalUs = 1e6 / this.#dice.between(slowestLickHz, fastestLickHz);
    this.nextUs = Math.max(fromUs, this.#freeUs);
  }

  /** Plans the irregular contacts of grooming. */
  groom(fromUs: number, lastsUs: number): void {
    if (this.#left > 0) return;
    this.tongue = false;
    this.#left = 1000;
    this.#groomUntilUs = fromUs + lastsUs;
    this.nextUs = Math.max(fromUs, this.#freeUs);
  }

  /** The planned contact begins now; plans the next. @returns how long it lasts, microseconds */
  touch(): number {
    const nowUs = this.nextUs;
    const dice = this.#dice;
    const { shortestContactMs, longestContactMs } = this.#parameters;
    let contactUs: number;
    let intervalUs: number;
    this.#left--;
    if (this.tongue) {
      contactUs = Math.round(1000 * dice.between(shortestContactMs, longestContactMs));
      intervalUs = Math.round(this.#intervalUs * dice.between(0.95, 1.05));
    } else {
      contactUs = Math.round(dice.between(5_000, 250_000));
      intervalUs = contactUs + Math.round(dice.between(20_000, 300_000));
      if (nowUs + intervalUs > this.#groomUntilUs) this.#left = 0;
    }
    this.#freeUs = nowUs + Math.max(intervalUs, contactUs + 10_000);
    this.nextUs = this.#left > 0 ? this.#freeUs : NEVER;
    return contactUs;
  }
}
