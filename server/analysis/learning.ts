import { median } from './align/robustLine.js';
import { dropsOf, lapsOf } from './happenings.js';
import { learnedOf } from './learned.js';
import { lickingOf } from './licking.js';
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
  const sum = (of: (row: (typeof licking.laps)[number]) => number) =>
    licking.laps.reduce((total, row) => total + of(row), 0);
  return {
    ...{ name: description.name, subject: description.subject, startedAt: description.startedAt },
    title: description.title,
    ...{ minutes, laps: laps.length, lapsPerMinute: laps.length / minutes },
    lickShare: sum((row) => row.inSpout + row.inApproach) / sum((row) => row.licks),
    slowing: median(licking.laps.map((row) => row.slowing).filter(Number.isFinite)),
    waterUl: dropsOf(session).reduce((total, { volumeUl }) => total + volumeUl, 0),
    learnedAtLap: learnedOf(laps, profile, licking)?.firstLap ?? Number.NaN,
  };
}
