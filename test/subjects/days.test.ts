import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { dayAfter, dayOf, instantOf, inZone } from '../../server/animals/days.js';

// Instants at which clocks change are the IANA time zone database's, by way of the ICU that comes
// with Node: Berlin on 2026-03-29 and 2026-10-25 at 01:00 UTC; Lord Howe by half an hour.
const BERLIN = 'Europe/Berlin';

describe('a local day', () => {
  it('begins at midnight in its zone, whatever UTC says', () => {
    expect(dayOf(new Date('2026-12-01T22:59:59Z'), BERLIN)).toBe('2026-12-01');
    expect(dayOf(new Date('2026-12-01T23:00:00Z'), BERLIN)).toBe('2026-12-02');
    expect(dayOf(new Date('2026-12-01T23:00:00Z'), 'America/Los_Angeles')).toBe('2026-12-01');
  });

  it('is 23 hours long when clocks go forward, and 25 when they go back', () => {
    const lengthH = (day: string) =>
      (instantOf('00:00', BERLIN, dayAfter(day)).getTime() -
        instantOf('00:00', BERLIN, day).getTime()) /
      3_600_000;
    expect(lengthH('2026-03-29')).toBe(23);
    expect(lengthH('2026-10-25')).toBe(25);
    expect(lengthH('2026-12-01')).toBe(24);
    const beforeMidnight = new Date('2026-10-25T22:59:59Z');
    expect(dayOf(beforeMidnight, BERLIN)).toBe('2026-10-25');
    expect(dayOf(new Date(beforeMidnight.getTime() + 1000), BERLIN)).toBe('2026-10-26');
  });

  it('takes the first of two instants with one wall time, and none that the clocks skip', () => {
    const twice = instantOf('2026-10-25 02:30', BERLIN, '2026-10-25');
    expect(twice.toISOString()).toBe('2026-10-25T00:30:00.000Z');
    expect(() => instantOf('2026-03-29 02:30', BERLIN, '2026-03-29')).toThrow(
      /clocks went forward/,
    );
  });

  it('is written with the offset of that very instant', () => {
    expect(inZone(new Date('2026-10-25T00:30:00Z'), BERLIN)).toBe('2026-10-25T02:30:00.000+02:00');
    expect(inZone(new Date('2026-10-25T01:30:00Z'), BERLIN)).toBe('2026-10-25T02:30:00.000+01:00');
    expect(inZone(new Date('2026-06-01T00:00:00Z'), 'Australia/Lord_Howe')).toMatch(/\+10:30$/);
    expect(inZone(new Date('2026-06-01T12:00:00Z'), 'America/St_Johns')).toMatch(/-02:30$/);
  });

  it('is read back from what was written, at any instant in any zone', () => {
    const zone = fc.constantFrom(
      ...[BERLIN, 'UTC', 'Australia/Lord_Howe', 'America/St_Johns', 'Pacific/Apia', 'Asia/Tehran'],
    );
    const instant = fc.date({
      min: new Date('2005-01-01T00:00:00Z'),
      max: new Date('2035-01-01T00:00:00Z'),
      noInvalidDate: true,
    });
    fc.assert(
      fc.property(zone, instant, (where, when) => {
        const text = inZone(when, where);
        expect(new Date(text).getTime()).toBe(when.getTime());
        expect(text.slice(0, 10)).toBe(dayOf(when, where));
        // To the second, the wall time finds the instant, or the other one of the same wall time.
        const found = instantOf(text.slice(0, 19), where, '2026-12-01');
        expect(inZone(found, where).slice(0, 19)).toBe(text.slice(0, 19));
        expect(Math.abs(found.getTime() - when.getTime())).toBeLessThanOrEqual(3_600_999);
      }),
      { seed: 41, numRuns: 400 },
    );
  });

  it('refuses what is no time, and says what was expected', () => {
    for (const text of ['noon', '25:00', '2026-02-30 10:00', '', '1830']) {
      expect(() => instantOf(text, BERLIN, '2026-12-01'), text).toThrow(/time|exist/);
    }
  });
});
