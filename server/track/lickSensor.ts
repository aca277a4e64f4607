import { LICK_DEFAULTS, type LickConfig } from './beltConfig.js';
import type { TrackEvent } from './events.js';

/** Rate is judged over this many onsets: three intervals would flag two quick licks by chance. */
const ONSETS = 5;
const LONG_AGO = Number.NEGATIVE_INFINITY;

/**
 * Contacts become licks: the first rise counts at once, then a lockout. Echoes of outputs and
 * onsets faster than any animal licks are told as artefacts and do not count.
 */
export class LickSensor {
  readonly #lockoutUs: number;
  readonly #bounceUs: number;
  readonly #artefactUs: number;
  readonly #stuckUs: number;
  readonly #fastestSpanUs: number;
  readonly #events: TrackEvent[];
  readonly #onsets = new Float64Array(ONSETS).fill(LONG_AGO);
  #onset = 0;
  #lastLickUs = LONG_AGO;
  #brokeUs = LONG_AGO;
  #outputChangedUs = LONG_AGO;
  #contactUs = LONG_AGO;
  /** The present contact is the tongue's and no echo, so its breaking may bounce. */
  #mayBounce = false;
  #contact = false;
  #stuck = false;
  #tooFast = false;

  constructor(config: LickConfig, events: TrackEvent[]) {
    this.#lockoutUs = config.lockoutUs ?? LICK_DEFAULTS.lockoutUs;
    this.#bounceUs = config.bounceUs ?? LICK_DEFAULTS.bounceUs;
    this.#artefactUs = config.artefactUs ?? LICK_DEFAULTS.artefactUs;
    this.#stuckUs = config.stuckUs ?? LICK_DEFAULTS.stuckUs;
    const fastestHz = config.fastestHz ?? LICK_DEFAULTS.fastestHz;
    this.#fastestSpanUs = Math.floor(((ONSETS - 1) * 1_000_000) / fastestHz);
    this.#events = events;
  }

  /** The contact is closed now. */
  get contact(): boolean {
    return this.#contact;
  }

  outputChanged(atUs: number): void {
    if (atUs > this.#outputChangedUs) this.#outputChangedUs = atUs;
  }

  /** @returns true when a lick begins with this rise */
  rise(stampUs: number): boolean {
    if (!this.#contact) {
      this.#contact = true;
      this.#contactUs = stampUs;
    }
    if (stampUs - this.#lastLickUs < this.#lockoutUs) return false;
    if (stampUs - this.#brokeUs < this.#bounceUs) return false;
    // An echo starts no lockout, or a real lick just behind it would be lost.
    const echo = Math.abs(stampUs - this.#outputChangedUs) <= this.#artefactUs;
    const artefact = echo || this.#fasterThanAny(stampUs);
    if (!echo) this.#lastLickUs = stampUs;
    this.#mayBounce = !artefact;
    this.#events.push({ kind: 'lick', artefact, stampUs });
    return !artefact;
  }

  fall(stampUs: number): void {
    this.#contact = false;
    if (this.#mayBounce) this.#brokeUs = stampUs;
    if (!this.#stuck) return;
    this.#stuck = false;
    this.#events.push({ kind: 'lick sensor', state: 'released' });
  }

  /** The level as found, without an edge: at the start, or after frames were lost. */
  adopt(level: boolean, nowUs: number): void {
    if (level === this.#contact) return;
    if (level) {
      this.#contact = true;
      this.#mayBounce = true;
      this.#contactUs = nowUs;
    } else {
      this.fall(nowUs);
    }
  }

  /** To be asked at every instant with the contact closed. */
  checkStuck(nowUs: number): void {
    if (this.#stuck || nowUs - this.#contactUs <= this.#stuckUs) return;
    this.#stuck = true;
    this.#events.push({ kind: 'lick sensor', state: 'stuck' });
  }

  #fasterThanAny(stampUs: number): boolean {
    this.#onset = (this.#onset + 1) % ONSETS;
    this.#onsets[this.#onset] = stampUs;
    const oldest = this.#onsets[(this.#onset + 1) % ONSETS]!;
    const tooFast = stampUs - oldest < this.#fastestSpanUs;
    if (tooFast && !this.#tooFast) this.#events.push({ kind: 'lick sensor', state: 'too fast' });
    this.#tooFast = tooFast;
    return tooFast;
  }
}
