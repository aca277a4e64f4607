import { DRINKING_US } from '../rules/learned.js';
import { median } from './align/robustLine.js';
import { dropsOf, type Lap, type Lick, licksOf } from './happenings.js';
import { isBetween, type Profile, speedBetween } from './profile.js';
import type { SessionData } from './readSession.js';

/** The spout's place reaches this far on both sides of where water comes; the approach before it. */
export const SPOUT_HALF_CM = 5;
export const APPROACH_CM = 20;

export interface LapLicking {
  readonly lap: number;
  /** Licks that drink no drop; and how many of them in the spout's place and in the approach. */
  readonly licks: number;
  readonly inSpout: number;
  readonly inApproach: number;
  readonly drinking: number;
  /** The first lick of the lap that drinks no drop, cm. */
  readonly firstCm: number | null;
  /** Speed in the approach over speed on the rest of the belt; below 1 is slowing. */
  readonly slowing: number;
}

export interface Licking {
  /** Where water came, the median place; null where none came at a known place. */
  readonly spoutCm: number | null;
  readonly before: readonly Lick[];
  readonly drinking: readonly Lick[];
  readonly laps: readonly LapLicking[];
}

/** Tells licks that wait for water from those that drink it, and sums them by lap. */
export function lickingOf(session: SessionData, laps: readonly Lap[], profile: Profile): Licking {
  const length = session.rig.belt.lengthCm;
  const drops = dropsOf(session);
  const places = drops.flatMap(({ positionCm }) => (positionCm === null ? [] : [positionCm]));
  const spoutCm = places.length === 0 ? null : median(places);
  const licks = licksOf(session).filter(({ artefact }) => !artefact);
  const drinks = ({ boardUs }: Lick) =>
    drops.some((drop) => boardUs >= drop.boardUs && boardUs < drop.boardUs + DRINKING_US);
  const before = licks.filter((lick) => !drinks(lick));
  const drinking = licks.filter(drinks);
  const wrap = (cm: number) => ((cm % length) + length) % length;
  const from = wrap((spoutCm ?? 0) - SPOUT_HALF_CM);
  const to = wrap((spoutCm ?? 0) + SPOUT_HALF_CM);
  const approach = wrap(from - APPROACH_CM);
  const count = (list: readonly Lick[], a: number, b: number) =>
    spoutCm === null
      ? 0
      : list.filter((l) => l.positionCm !== null && isBetween(l.positionCm, a, b)).length;
  const rows = laps.map(({ lap }, i) => {
    const own = before.filter((lick) => lick.lap === lap);
    const row = profile.laps[i]!;
    return {
      ...{ lap, licks: own.length, inSpout: count(own, from, to) },
      inApproach: count(own, approach, from),
      drinking: drinking.filter((lick) => lick.lap === lap).length,
      firstCm: own[0]?.positionCm ?? null,
      slowing:
        spoutCm === null
          ? Number.NaN
          : speedBetween(profile, row, approach, from) / speedBetween(profile, row, to, approach),
    };
  });
  return { spoutCm, before, drinking, laps: rows };
}
