import { type Interval, seedOf } from './bootstrap.js';
import { dropsOf, lapsOf } from './happenings.js';
import { learnedOf } from './learned.js';
import { lickingOf } from './licking.js';
import { lickingIntervals } from './lickingIntervals.js';
import { profileOf } from './profile.js';
import type { SessionData } from './readSession.js';

/** One session of a subject, in the few numbers that change as it learns. */
export interface LearningDay {
  readonly name: string;
  readonly subject: string;
  readonly startedAt: string;
  /** The rules file's title. */
  readonly title: string;
  readonly minutes: number;
  readonly laps: number;
  readonly lapsPerMinute: number;
  /** Of licks that wait for water: the share at the spout or in the approach. NaN without licks. */
  readonly lickShare: number;
  /** Median over laps of speed in the approach over speed elsewhere. */
  readonly slowing: number;
  /** The same with their 95 % intervals over the laps of this session alone. */
  readonly overLaps: { readonly lickShare: Interval; readonly slowing: Interval };
  readonly waterUl: number;
  /** The lap at whose end the criterion of having learned was first met; NaN: on none. */
  readonly learnedAtLap: number;
}

/** Complete laps that nobody excluded count; water counts whenever it was given. */
export function learningDay(session: SessionData): LearningDay {
  const { description, beganUs, endedUs } = session;
  const laps = lapsOf(session).filter(({ complete, excluded }) => complete && !excluded);
  const profile = profileOf(session, laps);
  const licking = lickingOf(session, laps, profile);
  const minutes = (endedUs - beganUs) / 60e6;
  const { lickShare, slowing } = lickingIntervals(licking, seedOf(description.seed));
  return {
    ...{ name: description.name, subject: description.subject, startedAt: description.startedAt },
    title: description.title,
    ...{ minutes, laps: laps.length, lapsPerMinute: laps.length / minutes },
    ...{ lickShare: lickShare.estimate, slowing: slowing.estimate },
    overLaps: { lickShare, slowing },
    waterUl: dropsOf(session).reduce((total, { volumeUl }) => total + volumeUl, 0),
    learnedAtLap: learnedOf(laps, profile, licking)?.firstLap ?? Number.NaN,
  };
}
