import type { GuardConfig } from '../../server/guard/guard.js';
import type { OutputOrder } from '../../server/rules/instant.js';

export const VALVE = 0;
export const LASER = 1;
export const SYNC = 2;

/** A valve of 10 us a nanolitre, a laser with every limit, and a sync line. */
export const RIG: GuardConfig = {
  outputs: [
    {
      name: 'valve',
      index: VALVE,
      kind: 'valve',
      longestOnUs: 250_000,
      leastGapUs: 100_000,
      valve: { deadUs: 8000, usPerNl: 10, leastNl: 1000, mostNl: 12_000 },
    },
    {
      name: 'laser',
      index: LASER,
      kind: 'stimulus',
      longestOnUs: 500_000,
      leastGapUs: 20_000,
      perSession: 100,
      duty: { share: 0.1, windowUs: 10_000_000 },
    },
    { name: 'sync', index: SYNC, kind: 'mark', longestOnUs: 100_000, leastGapUs: 10_000 },
  ],
  water: {
    perSessionNl: 1_000_000,
    perDayNl: 1_500_000,
    mostDropNl: 10_000,
    givenTodayNl: 0,
  },
};

/** The orders of the guard's tests say only what matters to each. */
export function pulse(output: number, widthUs: number, more: Partial<OutputOrder> = {}) {
  return {
    output,
    widthUs,
    volumeNl: 0,
    periodUs: 0,
    repeats: 1,
    stoppable: false,
    delayUs: 0,
    ...more,
  } satisfies OutputOrder;
}

export function drop(volumeNl: number): OutputOrder {
  return pulse(VALVE, 8000 + 10 * volumeNl, { volumeNl });
}
