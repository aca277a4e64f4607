import { firingsOf } from './firings.js';
import { dropsOf, licksOf } from './happenings.js';
import type { SessionData } from './readSession.js';

export interface LapCounts {
  /** Possible artefacts left out. */
  readonly licks: number;
  readonly waterUl: number;
  /** Outputs fired, shams left out. */
  readonly firings: number;
  readonly shams: number;
}

/** What happened on a lap, counted. */
export function countsByLap(session: SessionData): (lap: number) => LapCounts {
  const counts = new Map<number, { -readonly [K in keyof LapCounts]: LapCounts[K] }>();
  const of = (lap: number) => {
    let found = counts.get(lap);
    if (found === undefined) {
      found = { licks: 0, waterUl: 0, firings: 0, shams: 0 };
      counts.set(lap, found);
    }
    return found;
  };
  for (const { lap, artefact } of licksOf(session)) if (!artefact) of(lap).licks++;
  for (const { lap, volumeUl } of dropsOf(session)) of(lap).waterUl += volumeUl;
  for (const { lap, sham } of firingsOf(session)) of(lap)[sham ? 'shams' : 'firings']++;
  return of;
}
