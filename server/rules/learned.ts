/**
 * When an animal is said to have learned where the water comes: a criterion that is stated, not a
 * test of significance. Over the last ten whole laps it has licked in waiting at least once a lap
 * on average; at least 70 % of those licks fell in the span named; and its mean speed in that span
 * was at most 80 % of its mean speed on the rest of the belt (common practice, no source).
 *
 * The span to name is the way up to the water, not beyond it: an animal that stops to drink has not
 * slowed down because it knew what comes.
 *
 * A lick waits for water unless a drop was given less than two seconds before it.
 */
export const LEARNED = {
  laps: 10,
  leastLicksPerLap: 1,
  leastShare: 0.7,
  /** Speed in the span over speed elsewhere, at most. */
  mostSlowing: 0.8,
} as const;

/** Licks this soon after a drop drink it (common practice, no source). */
export const DRINKING_US = 2_000_000;

/** Sums over the criterion's laps. */
export interface LearnedSums {
  readonly licks: number;
  readonly licksInSpan: number;
  /** Any unit, the same for both. */
  readonly distance: number;
  readonly distanceInSpan: number;
  readonly duration: number;
  readonly durationInSpan: number;
}

/** Whether the sums meet the criterion; undefined where the animal was never in the span, or never out of it. */
export function hasLearned(sums: LearnedSums): boolean | undefined {
  const outside = sums.duration - sums.durationInSpan;
  if (!(sums.durationInSpan > 0) || !(outside > 0)) return undefined;
  if (sums.licks < LEARNED.laps * LEARNED.leastLicksPerLap) return false;
  if (sums.licksInSpan < LEARNED.leastShare * sums.licks) return false;
  const speedIn = sums.distanceInSpan / sums.durationInSpan;
  const speedOut = (sums.distance - sums.distanceInSpan) / outside;
  return speedIn <= LEARNED.mostSlowing * speedOut;
}
