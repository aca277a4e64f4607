import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { Entry } from '../../server/animals/entry.js';
import { cardOn, historyOf } from '../../server/animals/history.js';
import { lastWeighing, levelOf, percentOf, weighedOn } from '../../server/animals/weight.js';
import { entry, history, weight } from './helpers.js';

const DAY = '2026-12-01';

describe('an animal put together from its entries', () => {
  it('is the same whatever the order in which they are read', () => {
    const entries = [
      entry({ kind: 'card', set: { targetUl: 1000, strain: 'a' } }),
      entry({ kind: 'card', set: { targetUl: 900 } }),
      weight('2026-12-01T08:00:00Z', 24),
      entry({ kind: 'card', set: { strain: 'b' } }),
      weight('2026-12-01T09:00:00Z', 23.5),
    ];
    const expected = history(entries);
    fc.assert(
      fc.property(fc.shuffledSubarray(entries, { minLength: entries.length }), (shuffled) => {
        expect(history(shuffled)).toEqual(expected);
      }),
      { seed: 5, numRuns: 60 },
    );
    expect(cardOn(expected, DAY)).toMatchObject({ targetUl: 900, strain: 'b' });
  });

  it('keeps a change that was made in the knowledge of another after it, whatever the clocks say', () => {
    const clock = fc.integer({ min: -7_200_000, max: 7_200_000 });
    const writes = fc.array(fc.record({ rig: fc.constantFrom('a', 'b'), sees: fc.boolean() }), {
      minLength: 2,
      maxLength: 30,
    });
    fc.assert(
      fc.property(clock, clock, writes, (aheadA, aheadB, list) => {
        const entries: Entry[] = [];
        const seen = { a: 0, b: 0 };
        let last: { value: number; sawAll: boolean } | undefined;
        list.forEach(({ rig, sees }, n) => {
          const name = rig as 'a' | 'b';
          const most = Math.max(0, ...entries.map(({ step }) => step));
          // A rig that reads first knows all; one that does not knows what it knew.
          if (sees) seen[name] = most;
          const step = seen[name] + 1;
          last = { value: n + 1, sawAll: seen[name] === most };
          seen[name] = step;
          const ms = Date.parse('2026-12-01T12:00:00Z') + n * 60_000;
          const written = new Date(ms + (name === 'a' ? aheadA : aheadB)).toISOString();
          entries.push(
            entry({ kind: 'card', set: { targetUl: n + 1 } }, { step, written, computer: name }),
          );
        });
        if (last!.sawAll) expect(cardOn(history(entries), DAY).targetUl).toBe(last!.value);
      }),
      { seed: 6, numRuns: 300 },
    );
  });

  it('says when two clocks disagree, and by how much at least', () => {
    const before = weight('2026-12-01T12:00:00Z', 24);
    const first = entry(
      { kind: 'weight', at: '2026-12-01T12:10:00Z', grams: 24 },
      { computer: 'rig-b', written: '2026-12-01T12:10:00.000Z' },
    );
    const later = entry(
      { kind: 'weight', at: '2026-12-01T12:01:00Z', grams: 24 },
      { computer: 'rig-a', written: '2026-12-01T12:01:30.000Z' },
    );
    const [trouble] = history([first, later]).troubles;
    expect(trouble!.what).toBe(
      'the clock of rig-a is behind that of rig-b, by 8 min or more: set both by a time server',
    );
    expect(history([before, first]).troubles).toEqual([]);
  });

  it('says when two rigs set one field at once, and keeps both', () => {
    const a = entry({ kind: 'card', set: { targetUl: 900 } }, { step: 7, by: 'ann' });
    const b = entry({ kind: 'card', set: { targetUl: 1100 } }, { step: 7, by: 'bea' });
    const found = history([b, a]);
    expect(found.troubles[0]!.what).toMatch(/targetUl was set to 900 \(ann\) and to 1100 \(bea\)/);
    expect(found.cards).toHaveLength(2);
    expect(cardOn(found, DAY).targetUl).toBe(1100);
  });

  it('corrects by a new entry, and the last correction counts', () => {
    const wrong = weight('2026-12-01T08:00:00Z', 42.1);
    const right = entry({
      kind: 'correction',
      of: wrong.id,
      grams: 24.1,
      reason: 'swapped digits',
    });
    const struck = entry({ kind: 'correction', of: wrong.id, reason: 'the wrong cage' });
    expect(weighedOn(history([wrong, right]), DAY)!.grams).toBe(24.1);
    expect(history([wrong, right]).weighings[0]!.correction).toBe('swapped digits');
    const both = history([wrong, right, struck]);
    expect(weighedOn(both, DAY)).toBeUndefined();
    expect(both.entries).toHaveLength(3);
    const again = entry({ kind: 'correction', of: wrong.id, grams: 24.2, reason: 'it was ours' });
    expect(weighedOn(history([wrong, right, struck, again]), DAY)!.grams).toBe(24.2);
  });

  it('is weighed on the local day of the zone', () => {
    const late = weight('2026-12-01T23:30:00Z', 24);
    expect(weighedOn(historyOf('m31', [late], 'UTC'), '2026-12-01')!.grams).toBe(24);
    const berlin = historyOf('m31', [late], 'Europe/Berlin');
    expect(weighedOn(berlin, '2026-12-01')).toBeUndefined();
    expect(weighedOn(berlin, '2026-12-02')!.grams).toBe(24);
  });
});

describe('weight as percent of the corrected baseline', () => {
  const card = { ...cardOn(history([]), DAY), baselineG: 25, implantG: 1.5, leastPercent: 80 };

  it('takes the implant off the weight, and off a baseline that was weighed with it', () => {
    // By hand: (22.5 - 1.5) / 25 and (22.5 - 1.5) / (25 - 1.5).
    expect(percentOf(card, 22.5)).toBeCloseTo(84, 10);
    expect(percentOf({ ...card, implantInBaseline: true }, 22.5)).toBeCloseTo(89.3617, 4);
    expect(percentOf({ ...card, baselineG: null }, 22.5)).toBeNull();
  });

  it('alarms below the level of the protocol, and warns within 5 points of it', () => {
    // 80 % of the baseline: common practice, no source.
    expect(levelOf(card, 79.99)).toBe('below');
    expect(levelOf(card, 80)).toBe('near');
    expect(levelOf(card, 84.9)).toBe('near');
    expect(levelOf(card, 85)).toBe('fine');
    expect(levelOf({ ...card, leastPercent: 85 }, 84)).toBe('below');
    expect(levelOf(card, null)).toBe('unknown');
  });

  it('reads an old weight by the card as it was that day', () => {
    const found = history([
      entry({ kind: 'card', set: { baselineG: 25, implantG: 0 } }),
      weight('2026-11-20T08:00:00Z', 24),
      entry({ kind: 'card', set: { implantG: 2 }, from: '2026-11-25' }),
      weight('2026-11-26T08:00:00Z', 24),
    ]);
    expect(weighedOn(found, '2026-11-20')!.percent).toBeCloseTo(96, 10);
    expect(weighedOn(found, '2026-11-26')!.percent).toBeCloseTo(88, 10);
    expect(lastWeighing(found)!.day).toBe('2026-11-26');
  });
});
