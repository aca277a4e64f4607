import type { Lap } from './happenings.js';
import type { SessionData } from './readSession.js';

/** Running along the belt: a row of bins for each lap. */
export interface Profile {
  readonly binCm: number;
  readonly bins: number;
  readonly laps: readonly {
    readonly lap: number;
    /** Seconds in each bin, and the time integral of speed there, cm. */
    readonly seconds: Float64Array;
    readonly travelCm: Float64Array;
  }[];
}

/** A pause between samples longer than this says nothing of where the animal was. */
const MOST_GAP_US = 100_000;

/** Time and movement in each bin of each lap; each sample's place and speed hold until the next. */
export function profileOf(session: SessionData, laps: readonly Lap[], bins = 60): Profile {
  const { samples: s, rig } = session;
  const binCm = rig.belt.lengthCm / bins;
  const rows = laps.map(({ lap, startUs, stopUs }) => {
    const seconds = new Float64Array(bins);
    const travelCm = new Float64Array(bins);
    const end = s.indexAt(stopUs);
    for (let i = s.indexAt(startUs); i < end && i + 1 < s.length; i++) {
      const us = s.boardUs[i + 1]! - s.boardUs[i]!;
      const position = s.positionCm[i]!;
      if (us > MOST_GAP_US || Number.isNaN(position)) continue;
      const bin = Math.min(bins - 1, Math.floor(position / binCm));
      seconds[bin]! += us / 1e6;
      travelCm[bin]! += (s.speedCmPerS[i]! * us) / 1e6;
    }
    return { lap, seconds, travelCm };
  });
  return { binCm, bins, laps: rows };
}

/** In each bin the time-weighted mean speed, and the spread (SD) of the laps' own means there. */
export function speedByPosition({ laps, bins }: Pick<Profile, 'laps' | 'bins'>) {
  return Array.from({ length: bins }, (_, bin) => {
    let seconds = 0;
    let travel = 0;
    const means: number[] = [];
    for (const lap of laps) {
      if (lap.seconds[bin] === 0) continue;
      seconds += lap.seconds[bin]!;
      travel += lap.travelCm[bin]!;
      means.push(lap.travelCm[bin]! / lap.seconds[bin]!);
    }
    const mean = means.reduce((sum, value) => sum + value, 0) / means.length;
    const squares = means.reduce((sum, value) => sum + (value - mean) ** 2, 0);
    const spread = means.length > 1 ? Math.sqrt(squares / (means.length - 1)) : Number.NaN;
    return { meanCmPerS: travel / seconds, spreadCmPerS: spread, seconds };
  });
}

/** Mean speed between two places (which may lie across 0 cm), time-weighted; NaN if never there. */
export function speedBetween(
  { binCm, bins }: Profile,
  lap: Profile['laps'][number],
  fromCm: number,
  toCm: number,
): number {
  let seconds = 0;
  let travel = 0;
  for (let bin = 0; bin < bins; bin++) {
    if (!isBetween((bin + 0.5) * binCm, fromCm, toCm)) continue;
    seconds += lap.seconds[bin]!;
    travel += lap.travelCm[bin]!;
  }
  return seconds === 0 ? Number.NaN : travel / seconds;
}

/** On a closed belt: from 170 to 10 cm goes across 0 cm. */
export function isBetween(cm: number, fromCm: number, toCm: number): boolean {
  return fromCm <= toCm ? cm >= fromCm && cm < toCm : cm >= fromCm || cm < toCm;
}
