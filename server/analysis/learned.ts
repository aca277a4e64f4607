import { hasLearned, LEARNED } from '../rules/learned.js';
import type { Drop, Lap } from './happenings.js';
import { APPROACH_CM, type Licking, SPOUT_HALF_CM } from './licking.js';
import { lickShareOf } from './lickingIntervals.js';
import { isBetween, type Profile } from './profile.js';

/** Where and when a session met the criterion of `learned in`, lap by lap. */
export interface Learned {
  /** The way up to the water that the criterion was asked of. */
  readonly fromCm: number;
  readonly toCm: number;
  /** The first lap at whose end it was met; null: on no lap. */
  readonly firstLap: number | null;
  /** Laps at whose end it was met, and of how many that had ten laps to look back over. */
  readonly met: number;
  readonly of: number;
}

/** Laps with and without water, for what the animal does when none comes. */
export interface OmissionRow {
  readonly water: boolean;
  readonly laps: number;
  /** Licks a lap that drink no drop, and the share of them at the spout or in the approach. */
  readonly licksPerLap: number;
  readonly share: number;
}

/**
 * The criterion over each ten complete laps in a row, from a record: over the 25 cm that end where
 * water came (the approach and the near half of the spout's place). Speeds are those of the profile's
 * bins whose middle lies in it.
 * @returns undefined where no water came at a known place
 */
export function learnedOf(
  laps: readonly Lap[],
  profile: Profile,
  { spoutCm, before }: Licking,
): Learned | undefined {
  if (spoutCm === null) return undefined;
  const length = profile.binCm * profile.bins;
  const toCm = spoutCm;
  const fromCm = (spoutCm - SPOUT_HALF_CM - APPROACH_CM + length) % length;
  const rows = laps.map(({ lap }, n) => {
    const own = before.filter((lick) => lick.lap === lap);
    const { seconds, travelCm } = profile.laps[n]!;
    const row = { licks: own.length, licksInSpan: 0, distance: 0, distanceInSpan: 0 };
    const time = { duration: 0, durationInSpan: 0 };
    for (const { positionCm: cm } of own) {
      if (cm !== null && isBetween(cm, fromCm, toCm)) row.licksInSpan++;
    }
    for (let bin = 0; bin < profile.bins; bin++) {
      row.distance += travelCm[bin]!;
      time.duration += seconds[bin]!;
      if (!isBetween((bin + 0.5) * profile.binCm, fromCm, toCm)) continue;
      row.distanceInSpan += travelCm[bin]!;
      time.durationInSpan += seconds[bin]!;
    }
    return { ...row, ...time };
  });
  let firstLap: number | null = null;
  let met = 0;
  let of = 0;
  for (let end = LEARNED.laps; end <= rows.length; end++) {
    of++;
    const window = rows.slice(end - LEARNED.laps, end);
    const sum = (key: keyof (typeof rows)[number]) => window.reduce((t, row) => t + row[key], 0);
    const learned = hasLearned({
      ...{ licks: sum('licks'), licksInSpan: sum('licksInSpan') },
      ...{ distance: sum('distance'), distanceInSpan: sum('distanceInSpan') },
      ...{ duration: sum('duration'), durationInSpan: sum('durationInSpan') },
    });
    if (learned !== true) continue;
    met++;
    firstLap ??= laps[end - 1]!.lap;
  }
  return { fromCm, toCm, firstLap, met, of };
}

/** Licking on laps that brought water beside laps that did not; without the latter there is nothing to compare. */
export function omissionsOf(licking: Licking, drops: readonly Drop[]): OmissionRow[] {
  const watered = new Set(drops.map(({ lap }) => lap));
  return [true, false].map((water) => {
    const rows = licking.laps.filter(({ lap }) => watered.has(lap) === water);
    const licks = rows.reduce((sum, row) => sum + row.licks, 0);
    const share = lickShareOf(rows);
    return { water, laps: rows.length, licksPerLap: licks / rows.length, share };
  });
}
