import { type Day, dayAfter } from './days.js';
import { type AnimalSession, cardOn, type HandWater, type History } from './history.js';

/** One animal's water on one local day. */
export interface DayWater {
  readonly day: Day;
  readonly sessions: readonly AnimalSession[];
  readonly byHand: readonly HandWater[];
  /** In sessions, by the board's word. */
  readonly earnedUl: number;
  readonly uncertainUl: number;
  /** Of `earnedUl`: perhaps not drunk, since no lick followed within 3 s. */
  readonly notLickedUl: number;
  readonly byHandUl: number;
  /** Sessions of the day whose water is not in the book yet: running, or never closed. */
  readonly open: readonly AnimalSession[];
  readonly targetUl: number | null;
  /** Still due: at least (all that may have been drunk was), at most; null without a target. */
  readonly due: { readonly leastUl: number; readonly mostUl: number } | null;
}

/** What an animal has had on a day, and what is still due to it. */
export function waterOn(history: History, day: Day): DayWater {
  const sessions = history.sessions.filter((session) => session.day === day);
  const byHand = history.handWater.filter((one) => one.day === day && !one.struck);
  const sum = (ul: (session: AnimalSession) => number | undefined) =>
    sessions.reduce((total, session) => total + (ul(session) ?? 0), 0);
  const earnedUl = sum(({ water }) => water?.givenUl);
  const uncertainUl = sum(({ water }) => water?.uncertainUl);
  const notLickedUl = sum(({ water }) => water?.notLickedUl);
  const byHandUl = byHand.reduce((total, { ul }) => total + ul, 0);
  const { targetUl, state } = cardOn(history, day);
  const target = state === 'restricted' ? targetUl : null;
  const left = (hadUl: number) => Math.max(0, Math.round((target! - hadUl) * 10) / 10);
  return {
    ...{ day, sessions, byHand, earnedUl, uncertainUl, notLickedUl, byHandUl },
    open: sessions.filter(({ water }) => water === null),
    targetUl: target,
    due:
      target === null
        ? null
        : {
            leastUl: left(earnedUl + uncertainUl + byHandUl),
            mostUl: left(earnedUl - notLickedUl + byHandUl),
          },
  };
}

/** The most that an animal may have had on a day: what a limit must count. */
export function mostHadUl({ earnedUl, uncertainUl, byHandUl }: DayWater): number {
  return earnedUl + uncertainUl + byHandUl;
}

/** The last so many days, the oldest first. */
export function waterByDay(history: History, today: Day, days: number): DayWater[] {
  return Array.from({ length: days }, (_, n) => waterOn(history, dayAfter(today, n - days + 1)));
}
