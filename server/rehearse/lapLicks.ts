import { median } from '../analysis/align/robustLine.js';
import { APPROACH_CM, SPOUT_HALF_CM } from '../analysis/licking.js';
import { isBetween } from '../analysis/profile.js';
import { DRINKING_US } from '../rules/learned.js';
import type { StampedDecision } from '../session/decisions.js';

/** Licks of one complete lap that drink no drop: those at the spout or in the approach, and all. */
export type LapLicks = readonly [near: number, all: number];

/**
 * Counts licks lap by lap as the session's report does (analysis/licking.ts), from decisions alone:
 * licks within 2 s of a drop drink it; the spout is where drops came, the median place.
 */
export class LapLicksCollector {
  readonly #licks: { us: number; lap: number; cm: number }[] = [];
  readonly #drops: number[] = [];
  readonly #places: number[] = [];
  #lap = 0;
  readonly #lengthCm: number;
  readonly #valves: ReadonlySet<string>;

  constructor(lengthCm: number, valves: readonly string[]) {
    this.#lengthCm = lengthCm;
    this.#valves = new Set(valves);
  }

  take(decision: StampedDecision): void {
    const { boardUs, lap, positionCm } = decision;
    switch (decision.kind) {
      case 'lick':
        if (decision.artefact || positionCm === null) return;
        this.#licks.push({ us: boardUs, lap, cm: positionCm });
        return;
      case 'fired': {
        const { output, riseUs, riseCm } = decision;
        if (output === null || !this.#valves.has(output)) return;
        this.#drops.push(riseUs ?? boardUs);
        const cm = riseCm ?? positionCm;
        if (cm !== null) this.#places.push(cm);
        return;
      }
      case 'lap began':
        this.#lap = decision.lap;
        return;
    }
  }

  /** Every complete lap, from the first; none where no water came, since then no place is the spout's. */
  get laps(): LapLicks[] {
    if (this.#places.length === 0) return [];
    const wrap = (cm: number) => cm - Math.floor(cm / this.#lengthCm) * this.#lengthCm;
    const spoutCm = median(this.#places);
    const from = wrap(spoutCm - SPOUT_HALF_CM - APPROACH_CM);
    const to = wrap(spoutCm + SPOUT_HALF_CM);
    const laps = Array.from({ length: Math.max(0, this.#lap - 1) }, (): [number, number] => [0, 0]);
    this.#drops.sort((a, b) => a - b);
    let drop = 0;
    for (const { us, lap, cm } of this.#licks) {
      while (drop < this.#drops.length && us >= this.#drops[drop]! + DRINKING_US) drop++;
      const drinks = drop < this.#drops.length && us >= this.#drops[drop]!;
      const row = laps[lap - 1];
      if (drinks || row === undefined) continue;
      row[1]++;
      if (isBetween(cm, from, to)) row[0]++;
    }
    return laps;
  }
}

/** The share at the spout or in the approach over all of these laps' licks; NaN without licks. */
export function lickShare(laps: readonly LapLicks[]): number {
  let near = 0;
  let all = 0;
  for (const [atSpout, every] of laps) {
    near += atSpout;
    all += every;
  }
  return near / all;
}
