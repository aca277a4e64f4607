/**
 * How the simulated animal behaves, in one place. Every value is `common practice, no source`:
 * what people who run head-fixed mice on a belt expect to see, not a measurement of ours.
 */
export interface AnimalParameters {
  /** A bout's cruising speed is drawn between these, cm/s. */
  readonly slowestCruiseCmPerS: number;
  readonly fastestCruiseCmPerS: number;
  /** Now and then a burst up to this speed, cm/s, and its chance in each stride. */
  readonly burstCmPerS: number;
  readonly burstChance: number;
  /** Speed follows what the animal wants with this time constant, s. */
  readonly responseS: number;
  /** A stride's speed differs from the cruising speed by at most this share. */
  readonly strideSpread: number;
  /** Mean lengths of running bouts and of pauses when thirsty, s. */
  readonly boutS: number;
  readonly pauseS: number;
  /** Chance that a pause begins with a small step back, how far, and how fast. */
  readonly backChance: number;
  readonly backMostCm: number;
  readonly backCmPerS: number;
  /** Chance that a pause turns into grooming, which touches the lick sensor. */
  readonly groomChance: number;
  readonly groomLeastMs: number;
  readonly groomMostMs: number;

  /** Licks within a lick bout, per second, and how long the tongue touches, ms. */
  readonly slowestLickHz: number;
  readonly fastestLickHz: number;
  readonly shortestContactMs: number;
  readonly longestContactMs: number;
  /** Licks in one bout without water, and after a drop. */
  readonly dryLicks: number;
  readonly drinkLicks: number;
  /** Lick bouts a naive animal begins per second of running, wherever it is. */
  readonly naiveBoutsPerS: number;
  /** What is left of that in a trained one. */
  readonly trainedBoutsPerS: number;

  /** A trained animal slows over this distance before the spout's place, down to this speed. */
  readonly slowingCm: number;
  readonly spoutCmPerS: number;
  /** It begins to lick this far before the place, and stays for so long once there was water. */
  readonly anticipationCm: number;
  readonly drinkS: number;
  /** Water that one lick takes, uL. */
  readonly sipUl: number;

  /** Share of what is still to be learned that one drop at the expected place teaches. */
  readonly learningPerDrop: number;
  /** How far a drop may fall from the expected place and still confirm it. */
  readonly samePlaceCm: number;
  /** Water that quenches the thirst wholly, uL, and the thirst at which the animal stops running. */
  readonly quenchedUl: number;
  readonly idleBelowThirst: number;
}

export const ANIMAL: AnimalParameters = {
  slowestCruiseCmPerS: 14,
  fastestCruiseCmPerS: 28,
  burstCmPerS: 60,
  burstChance: 0.015,
  responseS: 0.25,
  strideSpread: 0.2,
  boutS: 9,
  pauseS: 2.5,
  backChance: 0.3,
  backMostCm: 1.5,
  backCmPerS: 4,
  groomChance: 0.08,
  groomLeastMs: 800,
  groomMostMs: 3000,

  slowestLickHz: 5.5,
  fastestLickHz: 8.5,
  shortestContactMs: 15,
  longestContactMs: 80,
  dryLicks: 4,
  drinkLicks: 12,
  naiveBoutsPerS: 0.35,
  trainedBoutsPerS: 0.01,

  slowingCm: 25,
  spoutCmPerS: 4,
  anticipationCm: 9,
  drinkS: 1.6,
  sipUl: 1.2,

  learningPerDrop: 0.06,
  samePlaceCm: 12,
  quenchedUl: 1200,
  idleBelowThirst: 0.05,
};
