import { volumeWords } from './words.js';

/** Limits on water, nanolitres. */
export interface WaterLimits {
  readonly perSessionNl: number;
  readonly perDayNl: number;
  /** The largest single drop. */
  readonly mostDropNl: number;
  /** What this animal was given earlier today, other sessions' uncertain drops included. */
  readonly givenTodayNl: number;
}

/** Water of one session: given, perhaps given, reserved, and withheld as a sham. */
export class WaterBook {
  givenNl = 0;
  uncertainNl = 0;
  reservedNl = 0;
  /** Shams count for the limits as if they were real, and give nothing. */
  shamNl = 0;
  readonly #limits: WaterLimits;

  constructor(limits: WaterLimits) {
    this.#limits = limits;
  }

  /** Left of the tighter of the two limits. */
  get leftNl(): number {
    const { perSessionNl, perDayNl, givenTodayNl } = this.#limits;
    return Math.max(0, Math.min(perSessionNl, perDayNl - givenTodayNl) - this.#charged);
  }

  /** Why a drop of `nl` cannot be given when `askedNl` is already asked beside it. */
  problem(nl: number, askedNl: number, name: string): string | undefined {
    const { perSessionNl, perDayNl, mostDropNl, givenTodayNl } = this.#limits;
    if (nl > mostDropNl) {
      return `${name}: a drop of ${volumeWords(nl)} asked, ${volumeWords(mostDropNl)} is the most`;
    }
    const all = nl + askedNl;
    const session = perSessionNl - this.#charged;
    if (all > session) return this.#short(name, all, session, perSessionNl, 'the session');
    const day = perDayNl - givenTodayNl - this.#charged;
    if (all > day) return this.#short(name, all, day, perDayNl, 'the day');
    return undefined;
  }

  get #charged(): number {
    return this.givenNl + this.uncertainNl + this.reservedNl + this.shamNl;
  }

  #short(name: string, askedNl: number, leftNl: number, ofNl: number, per: string): string {
    const left = volumeWords(Math.max(0, leftNl));
    return `${name}: ${volumeWords(askedNl)} asked, ${left} left of ${volumeWords(ofNl)} for ${per}`;
  }
}
