import { afterAll, describe, expect, it } from 'vitest';
import { learningDay } from '../../server/analysis/learning.js';
import { readSession } from '../../server/analysis/readSession.js';
import { learningPage } from '../../server/export/report/learningPage.js';
import { recordedSession } from '../analysis/recorded.js';

const naive = recordedSession({ minutes: 5, simulated: { trained: false } });
const trained = recordedSession({ minutes: 5, simulated: { trained: true } });
afterAll(() => {
  naive.remove();
  trained.remove();
});

describe('learning across sessions', () => {
  it("shows in a trained animal's licks, and counts laps and water as the engine did", async () => {
    const before = learningDay(await readSession(naive.folder));
    const after = learningDay(await readSession(trained.folder));
    expect(after.lickShare).toBeGreaterThan(before.lickShare);
    for (const [day, { core }] of [
      [before, naive],
      [after, trained],
    ] as const) {
      expect(day.laps).toBe(core.instant.lap - 1);
      expect(day.waterUl).toBeCloseTo(core.guard.waterGivenNl / 1_000, 9);
      expect(day.lapsPerMinute).toBeCloseTo(day.laps / day.minutes, 12);
      for (const measure of ['lickShare', 'slowing'] as const) {
        const { estimate, low, high } = day.overLaps[measure];
        expect(estimate).toBe(day[measure]);
        expect(low).toBeLessThan(estimate);
        expect(high).toBeGreaterThan(estimate);
      }
    }
    const page = learningPage([{ ...after, startedAt: '2026-03-05T09:00:00.000+00:00' }, before]);
    expect(page.indexOf('2026-03-04')).toBeLessThan(page.indexOf('2026-03-05'));
    expect(page.match(/<svg/g)).toHaveLength(4);
    expect(page).not.toMatch(/NaN|Infinity|undefined|<script|https?:/);
  });
});
