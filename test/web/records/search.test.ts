import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import type { SessionQuery, SessionRow } from '../../../server/web/records/recordsMessages.js';
import { searchSessions } from '../../../server/web/records/search.js';
import { badRow } from '../../../server/web/records/sessionRow.js';

function row(change: Partial<SessionRow>): SessionRow {
  return {
    ...{ name: 'a', bad: null, subject: 'm07', title: 'Water at 90', experimenter: 'A. Person' },
    ...{ protocolNumber: 'P-12', sessionNumber: 1, startedAt: '2026-03-04T09:30:00+01:00' },
    ...{ rules: 'water.yaml', recording: false, minutes: 20, givenUl: 400, uncertainUl: 0 },
    ...{ record: 'whole', check: 'identical', simulated: false },
    ended: { how: 'rules', at: '2026-03-04T09:50:00+01:00', reason: 'the time was up' },
    ...change,
  };
}

const ROWS = [
  row({ name: 'a', startedAt: '2026-03-04T23:30:00-05:00' }),
  row({ name: 'b', subject: 'm08', title: 'Induction', startedAt: '2026-03-06T10:00:00+01:00' }),
  row({ name: 'c', ended: null, record: null, check: null, minutes: null, givenUl: null }),
  row({ name: 'd', check: 'different', rules: 'place.yaml', minutes: 45 }),
  row({ name: 'e', record: 'torn', givenUl: 900 }),
  row({ name: 'f', ended: null, recording: true, record: null, check: null, minutes: null }),
  badRow('2026-03-01_08-00-00_m09_x', 'session.json is missing'),
];

const found = (query: SessionQuery, rows = ROWS) =>
  searchSessions(rows, query).rows.map(({ name }) => name);

describe('finding sessions', () => {
  test('begins with all of them, the newest first', () => {
    const all = searchSessions(ROWS, {});
    expect([all.total, all.found]).toEqual([7, 7]);
    // By the moment, whatever the zone: half past eleven in the west is the next day in Europe.
    expect(all.rows.map(({ name }) => name).slice(0, 2)).toEqual(['b', 'a']);
    expect(all.rows.at(-1)!.name).toBe('2026-03-01_08-00-00_m09_x');
    expect(all.subjects).toEqual([
      { subject: 'm08', sessions: 1 },
      { subject: 'm07', sessions: 5 },
    ]);
    expect(all.rules).toEqual(['place.yaml', 'water.yaml']);
  });

  test('by animal, rules file, title, words, day and what is the matter', () => {
    expect(found({ subject: 'm08' })).toEqual(['b']);
    expect(found({ rules: 'place.yaml' })).toEqual(['d']);
    expect(found({ title: 'induc' })).toEqual(['b']);
    expect(found({ text: 'INDUCTION p-12' })).toEqual(['b']);
    expect(found({ text: 'induction nowhere' })).toEqual([]);
    expect(found({ text: 'missing' })).toEqual(['2026-03-01_08-00-00_m09_x']);
    // The day by the clock on the wall where it was recorded.
    expect(found({ from: '2026-03-05' })).toEqual(['b']);
    expect(found({ to: '2026-03-01' })).toEqual(['2026-03-01_08-00-00_m09_x']);
    expect(found({ from: '2026-03-06', to: '2026-03-06' })).toEqual(['b']);
    expect(found({ state: 'recording' })).toEqual(['f']);
    expect(found({ state: 'ended' }).sort()).toEqual(['a', 'b', 'd', 'e']);
    expect(found({ state: 'trouble' }).sort()).toEqual([
      ...['2026-03-01_08-00-00_m09_x', 'c', 'd', 'e'],
    ]);
  });

  test('sorted by length or water, what has none comes last', () => {
    expect(found({ sort: 'minutes', order: 'down' })[0]).toBe('d');
    expect(found({ sort: 'water', order: 'down' })[0]).toBe('e');
    expect(found({ sort: 'subject', order: 'up' })[0]).toBe('2026-03-01_08-00-00_m09_x');
    const byTitle = found({ sort: 'title', order: 'up' });
    expect(byTitle[1]).toBe('b');
  });

  test('page by page, every session that fits comes once, whatever is asked', () => {
    const rows = fc.array(
      fc.record({
        subject: fc.constantFrom('m1', 'm2', ''),
        title: fc.constantFrom('one', 'two', 'Three'),
        minutes: fc.option(fc.integer({ min: 0, max: 3 })),
        givenUl: fc.option(fc.integer({ min: 0, max: 2 })),
        recording: fc.boolean(),
        startedAt: fc
          .integer({ min: 0, max: 40 })
          .map((day) => new Date(Date.UTC(2026, 0, 1 + day)).toISOString()),
      }),
      { maxLength: 60 },
    );
    const query = fc.record({
      sort: fc.constantFrom('started', 'subject', 'title', 'minutes', 'water'),
      order: fc.constantFrom('up', 'down'),
      text: fc.constantFrom('', 'o', 't e'),
      subject: fc.constantFrom('', 'm1'),
    });
    fc.assert(
      fc.property(rows, query, fc.integer({ min: 1, max: 9 }), (changes, asked, limit) => {
        const all = changes.map((change, n) => row({ name: `s${n}`, ...change }));
        const whole = searchSessions(all, { ...(asked as SessionQuery), limit: 1000 });
        const pages: string[] = [];
        for (let offset = 0; offset < whole.found; offset += limit) {
          pages.push(...found({ ...(asked as SessionQuery), offset, limit }, all));
        }
        expect(pages).toEqual(whole.rows.map(({ name }) => name));
        const expected = all.filter(
          ({ subject, name, title }) =>
            (asked.subject === '' || subject === asked.subject) &&
            asked.text
              .split(' ')
              .every((word) =>
                `${name} ${subject} ${title} a. person p-12 water.yaml the time was up`
                  .toLowerCase()
                  .includes(word),
              ),
        );
        expect(new Set(pages)).toEqual(new Set(expected.map(({ name }) => name)));
        expect(pages.length).toBe(expected.length);
      }),
      { seed: 6, numRuns: 80 },
    );
  });
});
