import type { Instant } from '../rules/instant.js';

/** An instant to be filled again and again. */
export function blankInstant(): Instant {
  return {
    nowUs: 0,
    trust: 'unknown',
    placed: false,
    lapCounts: 0,
    travelFrom: 0,
    travelTo: 0,
    progressFrom: 0,
    progressTo: 0,
    positionCm: Number.NaN,
    speedCmPerS: 0,
    lap: 0,
    lapBegan: false,
    lick: false,
    inputs: 0,
    rose: 0,
    fell: 0,
  };
}
