import type { Measure } from '../../analysis/acrossAnimals.js';
import { LEARNED } from '../../rules/learned.js';

interface Words {
  readonly label: string;
  /** For the head of a column. */
  readonly short: string;
  readonly digits: number;
  /** Where the axis of a figure ends, whatever the values. */
  readonly most?: number;
}

export const MEASURE_WORDS: Readonly<Record<Measure, Words>> = {
  lapsPerMinute: { label: 'laps a minute', short: 'laps/min', digits: 2 },
  lickShare: { label: 'lick share', short: 'lick share', digits: 2, most: 1 },
  slowing: { label: 'slowing', short: 'slowing', digits: 2 },
  waterUl: { label: 'water (uL)', short: 'water (uL)', digits: 1 },
};

export const MEASURES_EXPLAINED =
  'Lick share: of the licks that do not drink a drop, those at the spout (5 cm to each side) or in ' +
  'the 20 cm before it. Slowing: median over laps of the speed in those 20 cm over the speed on the ' +
  'rest of the belt; below 1 it slows. Complete laps that nobody left out.';

/** The criterion of having learned, in words; the span is said beside it. */
export const LEARNED_EXPLAINED =
  `Learned: over ${LEARNED.laps} complete laps in a row at least ${LEARNED.leastLicksPerLap} waiting lick ` +
  `a lap, at least ${LEARNED.leastShare * 100} % of them in the 25 cm up to the water, and a mean speed ` +
  `there of at most ${LEARNED.mostSlowing * 100} % of that elsewhere (common practice, no source). It is ` +
  'no test of significance.';
