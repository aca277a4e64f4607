import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { beforeSession } from '../../server/animals/beginning.js';
import { eveningList, overviewOf } from '../../server/animals/overview.js';
import { DropCount } from '../../server/animals/sessionWater.js';
import { waterByDay, waterOn } from '../../server/animals/waterBook.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import { entry, handWater, history, sessionEnded, weight } from './helpers.js';

const DAY = '2026-12-01';
const NOON = new Date('2026-12-01T12:00:00Z');
const restricted = entry({
  kind: 'card',
  set: { targetUl: 1000, state: 'restricted', baselineG: 25, leastPercent: 80 },
});
const began = (session: string, at = '2026-12-01T10:00:00Z') =>
  entry({ kind: 'session began', at, session, rig: 'rig b' });

describe('the water book', () => {
  it('takes from what is due what was earned on any rig and what was given by hand', () => {
    const water = waterOn(
      history([
        restricted,
        sessionEnded('2026-12-01T08:00:00Z', 300),
        sessionEnded('2026-12-01T10:00:00Z', 200),
        handWater('2026-12-01T17:00:00Z', 150),
        sessionEnded('2026-11-30T10:00:00Z', 999),
      ]),
      DAY,
    );
    expect(water).toMatchObject({ earnedUl: 500, byHandUl: 150, uncertainUl: 0 });
    expect(water.due).toEqual({ leastUl: 350, mostUl: 350 });
  });

  it('shows what is due as a range when drops are uncertain or perhaps not drunk', () => {
    const session = sessionEnded('2026-12-01T08:00:00Z', 400, { uncertainUl: 8, notLickedUl: 60 });
    const water = waterOn(history([restricted, session]), DAY);
    expect(water.due).toEqual({ leastUl: 592, mostUl: 660 });
  });

  it('always has at least as much due at most as at least, and never less than nothing', () => {
    const session = fc.record({
      given: fc.integer({ min: 0, max: 900 }),
      uncertain: fc.integer({ min: 0, max: 50 }),
      share: fc.integer({ min: 0, max: 100 }),
      handUl: fc.integer({ min: 1, max: 500 }),
    });
    fc.assert(
      fc.property(fc.array(session, { maxLength: 5 }), (sessions) => {
        const entries = sessions.flatMap(({ given, uncertain, share, handUl }, n) => [
          sessionEnded(`2026-12-01T0${n}:00:00Z`, given, {
            uncertainUl: uncertain,
            notLickedUl: (given * share) / 100,
          }),
          handWater(`2026-12-01T0${n}:30:00Z`, handUl),
        ]);
        const { due } = waterOn(history([restricted, ...entries]), DAY);
        expect(due!.leastUl).toBeGreaterThanOrEqual(0);
        expect(due!.mostUl).toBeGreaterThanOrEqual(due!.leastUl);
      }),
      { seed: 9, numRuns: 200 },
    );
  });

  it('counts a session once however often it is filed, by its last word', () => {
    const first = sessionEnded('2026-12-01T08:00:00Z', 300);
    const mended = { ...sessionEnded('2026-12-01T08:00:00Z', 320) };
    expect(waterOn(history([restricted, first, mended]), DAY).earnedUl).toBe(320);
  });

  it('counts a corrected session as the correction says', () => {
    const session = sessionEnded('2026-12-01T08:00:00Z', 300, { uncertainUl: 10 });
    const blocked = entry({ kind: 'correction', of: session.id, reason: 'the valve was blocked' });
    expect(waterOn(history([restricted, session, blocked]), DAY)).toMatchObject({
      ...{ earnedUl: 0, uncertainUl: 0, due: { leastUl: 1000, mostUl: 1000 } },
    });
  });

  it('puts water on its local day, on the days when clocks change too', () => {
    // Berlin, 2026-10-25: 25 hours from 22:00 UTC of the day before to 23:00 UTC.
    const entries = [
      handWater('2026-10-24T21:59:00Z', 1),
      handWater('2026-10-24T22:00:00Z', 2),
      handWater('2026-10-25T22:59:00Z', 4),
      handWater('2026-10-25T23:00:00Z', 8),
    ];
    const days = waterByDay(history([restricted, ...entries], 'Europe/Berlin'), '2026-10-26', 3);
    expect(days.map(({ day, byHandUl }) => [day, byHandUl])).toEqual([
      ['2026-10-24', 1],
      ['2026-10-25', 6],
      ['2026-10-26', 8],
    ]);
  });
});

describe('the evening list', () => {
  const evening = (...entries: Parameters<typeof history>[0]) =>
    eveningList(overviewOf([history([restricted, ...entries])], [], NOON, 'UTC'));

  it('names an animal that had no session and no water', () => {
    expect(evening()[0]).toMatchObject({ animal: 'm31', evening: 'no water today' });
  });

  it('names one that had less than its target, or may not have drunk it all', () => {
    expect(evening(handWater('2026-12-01T09:00:00Z', 999))[0]!.evening).toMatch(/less/);
    const unlicked = sessionEnded('2026-12-01T08:00:00Z', 1000, { notLickedUl: 12 });
    expect(evening(unlicked)[0]!.evening).toMatch(/perhaps not all was drunk/);
  });

  it('does not take a session for watering that the book does not know the end of', () => {
    const rows = evening(began('x'), handWater('2026-12-01T09:00:00Z', 2000));
    expect(rows[0]!.evening).toMatch(/not in the book yet/);
  });

  it('leaves out who had enough, has free water, or is gone', () => {
    expect(evening(handWater('2026-12-01T09:00:00Z', 1000))).toEqual([]);
    expect(evening(entry({ kind: 'card', set: { state: 'free' } }))).toEqual([]);
    expect(evening(entry({ kind: 'card', set: { state: 'left' } }))).toEqual([]);
  });

  it('names one whose target nobody has said, rather than hide it', () => {
    const rows = evening(entry({ kind: 'card', set: { targetUl: null } }));
    expect(rows[0]!.evening).toMatch(/no target/);
  });
});

describe('before a session', () => {
  const against = (...entries: Parameters<typeof history>[0]) =>
    beforeSession(history([restricted, ...entries]), NOON, 'UTC').against;

  it("asks for today's weight", () => {
    expect(against()[0]).toMatch(/not been weighed today \(2026-12-01\)/);
    expect(against(weight('2026-11-30T23:59:59Z', 24))[0]).toMatch(/not been weighed/);
    expect(against(weight('2026-12-01T00:00:00Z', 24))).toEqual([]);
  });

  it('speaks up below the alarm level, and not at it', () => {
    expect(against(weight('2026-12-01T08:00:00Z', 19.9))[0]).toMatch(/79\.6 %.*below 80 %.*vet/);
    expect(against(weight('2026-12-01T08:00:00Z', 20))).toEqual([]);
  });

  it('speaks up when a session is open, or the animal has left', () => {
    const weighed = weight('2026-12-01T08:00:00Z', 24);
    expect(against(weighed, began('x'))[0]).toMatch(/x on rig b gave is not in the water book/);
    const left = entry({ kind: 'card', set: { state: 'left' } });
    expect(against(weighed, left)[0]).toMatch(/no longer/);
  });

  it("counts for the day's limit all that it may have had: uncertain and by hand too", () => {
    const found = beforeSession(
      history([
        restricted,
        sessionEnded('2026-12-01T08:00:00Z', 300, { uncertainUl: 8, notLickedUl: 100 }),
        handWater('2026-12-01T09:00:00Z', 50),
      ]),
      NOON,
      'UTC',
    );
    expect(found.hadTodayUl).toBe(358);
  });
});

describe('drops of a session', () => {
  const stamp = { input: 1, lap: 1, positionCm: 0, speedCmPerS: 0 };
  const drop = (openedMs: number, volumeNl = 4_000): StampedDecision => ({
    ...{ ...stamp, kind: 'pulse done', rule: 'water', output: 'valve', onUs: 50_000, volumeNl },
    ...{ boardUs: openedMs * 1_000 + 50_000, reason: 'complete' },
  });
  const lick = (ms: number, artefact = false): StampedDecision => ({
    ...{ ...stamp, kind: 'lick', artefact, boardUs: ms * 1_000 },
  });
  const count = (...decisions: StampedDecision[]) => {
    const drops = new DropCount();
    for (const decision of decisions) drops.take(decision);
    return drops.water(0);
  };

  it('are drunk when a lick follows within 3 s of the opening, to the microsecond', () => {
    expect(count(drop(1_000), lick(4_000))).toMatchObject({ drops: 1, notLickedDrops: 0 });
    const late = { ...lick(4_000), boardUs: 4_000_001 };
    expect(count(drop(1_000), late)).toMatchObject({ notLickedDrops: 1, notLickedUl: 4 });
  });

  it('are drunk by a lick while the valve is open still', () => {
    expect(count(lick(1_020), drop(1_000)).notLickedDrops).toBe(0);
    expect(count(lick(999), drop(1_000)).notLickedDrops).toBe(1);
  });

  it('are not drunk by an artefact, nor by the end of the session', () => {
    expect(count(drop(1_000), lick(1_500, true)).notLickedDrops).toBe(1);
    expect(count(drop(1_000)).notLickedDrops).toBe(1);
  });

  it('are several, and one lick drinks all that wait', () => {
    const water = count(
      drop(1_000),
      drop(1_500),
      lick(2_000),
      drop(2_500),
      drop(9_000),
      lick(9_100),
    );
    expect(water).toMatchObject({ drops: 4, givenUl: 16, notLickedDrops: 1, notLickedUl: 4 });
  });
});
