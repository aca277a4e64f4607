import { Dice } from './dice.js';

export interface BeltParameters {
  readonly lengthCm: number;
  readonly countsPerCm: number;
  /** The mark's leading edge when the belt runs forwards, cm along the belt, and its width. */
  readonly markCm: number;
  readonly markWidthCm: number;
  /** False: no mark at all. */
  readonly mark: boolean;
  /** Mean and deviation of what the encoder reads too much per lap, cm. */
  readonly slipPerLapCm: number;
  readonly slipSpreadCm: number;
  /** Chance that the sensor misses the mark on one passing. */
  readonly markMissChance: number;
  /** Extra changes at each edge of the mark, and how soon after it they come. */
  readonly markBounces: number;
  readonly bounceMostUs: number;
}

export const BELT: BeltParameters = {
  lengthCm: 180,
  countsPerCm: 20,
  markCm: 0,
  markWidthCm: 1,
  mark: true,
  slipPerLapCm: 0.1,
  slipSpreadCm: 0.1,
  markMissChance: 0,
  markBounces: 0,
  bounceMostUs: 800,
};

/**
 * The belt below the animal and the encoder that it turns. `travelCm` is the truth: cm from the
 * belt's 0, unrolled. `encoder` is what the encoder has turned, in counts, not yet whole.
 */
export class Belt {
  readonly parameters: BeltParameters;
  travelCm: number;
  encoder: number;
  /** Counts per cm of true travel, slip included; drawn anew each lap. */
  countsPerTravelCm: number;
  #lap: number;
  #lapEndCm = 0;
  #lapStartCm = 0;
  readonly #dice: Dice;

  constructor(parameters: BeltParameters, startCm: number, startCount: number, seed: number) {
    this.parameters = parameters;
    this.travelCm = startCm;
    // Half a count past the step, so that the first one is as far off as on average.
    this.encoder = startCount + 0.5;
    this.#dice = new Dice(seed);
    this.countsPerTravelCm = parameters.countsPerCm;
    this.#lap = Math.floor(startCm / parameters.lengthCm);
    this.#newLap(this.#lap);
  }

  /** Whole laps of true travel; 0 before the belt's 0 has been passed once. */
  get lap(): number {
    return this.#lap;
  }

  /** True position along the belt, [0, length). */
  get positionCm(): number {
    return this.travelCm - this.#lapStartCm;
  }

  /** The animal has moved the belt by so much. */
  move(cm: number): void {
    this.travelCm += cm;
    this.encoder += cm * this.countsPerTravelCm;
    if (this.travelCm >= this.#lapEndCm) this.#newLap(this.#lap + 1);
    else if (this.travelCm < this.#lapStartCm) this.#newLap(this.#lap - 1);
  }

  /** The encoder turns without the belt: a sudden slip, cm as the encoder would read it. */
  slip(cm: number): void {
    this.encoder += cm * this.parameters.countsPerCm;
  }

  #newLap(lap: number): void {
    const { lengthCm, countsPerCm, slipPerLapCm, slipSpreadCm } = this.parameters;
    this.#lap = lap;
    this.#lapStartCm = lap * lengthCm;
    this.#lapEndCm = (lap + 1) * lengthCm;
    const slipCm = slipPerLapCm + slipSpreadCm * this.#dice.normal();
    this.countsPerTravelCm = countsPerCm * (1 + slipCm / lengthCm);
  }
}
