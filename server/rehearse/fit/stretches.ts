import type { SessionData } from '../../analysis/readSession.js';

/** Speed and place on an even grid: samples come as something changes. */
export interface Grid {
  readonly startUs: number;
  readonly speedCmPerS: Float64Array;
  /** NaN while position is unknown. */
  readonly positionCm: Float64Array;
}
export const GRID_S = 0.02;
const GRID_US = GRID_S * 1e6;

/** It runs from above the first speed until below the second, cm/s. */
export const RUNS_ABOVE = 5;
export const RESTS_BELOW = 2;

/** From one index of the grid up to and without another. */
export interface Stretch {
  readonly running: boolean;
  readonly from: number;
  readonly to: number;
}

export function gridOf({ samples, beganUs, endedUs }: SessionData): Grid {
  const length = Math.max(0, Math.floor((endedUs - beganUs) / GRID_US));
  const speedCmPerS = new Float64Array(length);
  const positionCm = new Float64Array(length);
  let at = 0;
  for (let n = 0; n < length; n++) {
    const us = beganUs + n * GRID_US;
    while (at + 1 < samples.length && samples.boardUs[at + 1]! <= us) at++;
    speedCmPerS[n] = samples.speedCmPerS[at] ?? 0;
    positionCm[n] = samples.positionCm[at] ?? Number.NaN;
  }
  return { startUs: beganUs, speedCmPerS, positionCm };
}

/** The grid's index at a time. */
export function indexAt({ startUs, speedCmPerS }: Grid, us: number): number {
  return Math.min(speedCmPerS.length, Math.max(0, Math.round((us - startUs) / GRID_US)));
}

/** Running bouts and the rests between them, in order. */
export function stretchesOf({ speedCmPerS }: Grid): Stretch[] {
  const stretches: Stretch[] = [];
  let running = false;
  let from = 0;
  for (let n = 0; n < speedCmPerS.length; n++) {
    const speed = speedCmPerS[n]!;
    if (running ? speed >= RESTS_BELOW : speed <= RUNS_ABOVE) continue;
    if (n > from) stretches.push({ running, from, to: n });
    running = !running;
    from = n;
  }
  if (speedCmPerS.length > from) stretches.push({ running, from, to: speedCmPerS.length });
  return stretches;
}

/** How far the belt still has to run from `cm` to `placeCm`, [0, length). */
export function aheadCm(cm: number, placeCm: number, lengthCm: number): number {
  const cmAhead = placeCm - cm;
  return cmAhead - Math.floor(cmAhead / lengthCm) * lengthCm;
}
