import { median } from './align/robustLine.js';
import { bootstrap, type Interval } from './bootstrap.js';
import type { LapLicking, Licking } from './licking.js';

/** Of licks that wait for water: the share at the spout or in the approach. NaN without licks. */
export function lickShareOf(laps: readonly LapLicking[]): number {
  let near = 0;
  let all = 0;
  for (const { inSpout, inApproach, licks } of laps) {
    near += inSpout + inApproach;
    all += licks;
  }
  return near / all;
}

/** Median over laps of speed in the approach over speed elsewhere; NaN where no lap has it. */
export function slowingOf(laps: readonly LapLicking[]): number {
  return median(laps.map(({ slowing }) => slowing).filter(Number.isFinite));
}

/**
 * Lick share and slowing with their 95 % intervals by bootstrap over the laps: of this session alone,
 * for across animals the unit is the animal.
 * @param seed the same seed gives the same intervals
 */
export function lickingIntervals(
  { laps }: Licking,
  seed: number,
): { readonly lickShare: Interval; readonly slowing: Interval } {
  return {
    lickShare: bootstrap(
      laps.filter(({ licks }) => licks > 0),
      lickShareOf,
      seed,
    ),
    slowing: bootstrap(
      laps.filter(({ slowing }) => Number.isFinite(slowing)),
      slowingOf,
      seed,
    ),
  };
}
