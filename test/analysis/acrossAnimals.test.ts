import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { acrossAnimals, animalsOf, bySession } from '../../server/analysis/acrossAnimals.js';
import type { LearningDay } from '../../server/analysis/learning.js';
import { animalsPage, animalsSummary } from '../../server/export/report/animalsPage.js';

const exact = (estimate: number) => ({
  ...{ estimate, low: estimate, high: estimate, standardError: 0 },
});
const day = (subject: string, number: number, lickShare: number, laps = 40): LearningDay => ({
  ...{ name: `${subject} ${number}`, subject, title: 'Water at a place' },
  startedAt: `2026-03-${String(number).padStart(2, '0')}T09:00:00.000+00:00`,
  ...{ minutes: 20, laps, lapsPerMinute: laps / 20, lickShare, slowing: 0.8, waterUl: 4 * laps },
  overLaps: { lickShare: exact(lickShare), slowing: exact(0.8) },
  learnedAtLap: 14,
});

describe('across animals', () => {
  it("a mean has the interval and the standard error that scipy's bootstrap gives", () => {
    // scipy 1.10.1 (Debian's python3-scipy): bootstrap((x,), np.mean, n_resamples=1000000,
    // method='percentile', random_state=1) gives 0.4750 to 0.6250, standard error 0.038515.
    const values = [0.42, 0.55, 0.61, 0.38, 0.72, 0.49, 0.66, 0.58];
    const found = acrossAnimals(values, 'some animals');
    expect(found.n).toBe(8);
    expect(found.estimate).toBeCloseTo(0.55125, 12);
    // Of 2000 rounds, a bound is known to about 0.002 and the standard error to 2 %.
    expect(Math.abs(found.low - 0.475)).toBeLessThan(0.006);
    expect(Math.abs(found.high - 0.625)).toBeLessThan(0.006);
    expect(Math.abs(found.standardError - 0.038515)).toBeLessThan(0.003);
  });

  it('the unit is the animal: more sessions or laps of one change neither n nor the interval', () => {
    const once = [day('a', 1, 0.2), day('b', 1, 0.5), day('c', 1, 0.6), day('d', 1, 0.9)];
    const more = [
      ...once,
      ...[2, 3, 4, 5, 6].map((n) => day('a', n, 0.2, 400)),
      ...[2, 3].map((n) => day('c', n, 0.6, 7)),
    ];
    const of = (days: LearningDay[]) => animalsSummary(days).across.lickShare;
    expect(of(more)).toEqual(of(once));
    expect(of(more).n).toBe(4);
    // Pooled over sessions instead, the mean would be 0.37.
    expect(of(more).estimate).toBeCloseTo(0.55, 12);
  });

  it("each animal's change is its last session less its first, in order of their start", () => {
    const days = [day('b', 9, 0.7), day('a', 3, 0.8), day('a', 1, 0.3), day('a', 2, 0.4)];
    const [a, b] = animalsOf(days);
    expect(a!.days.map(({ name }) => name)).toEqual(['a 1', 'a 2', 'a 3']);
    expect(a!.change.lickShare).toBeCloseTo(0.5, 12);
    expect(a!.mean.lickShare).toBeCloseTo(0.5, 12);
    expect(b!.change.lickShare).toBeNaN();
    const sessions = bySession([a!, b!], 'lickShare', 's');
    expect(sessions.map(({ n }) => n)).toEqual([2, 1, 1]);
    expect(sessions[0]!.estimate).toBeCloseTo(0.5, 12);
    expect(sessions[1]!.low).toBeNaN();
  });

  it('an animal without a value is left out of that measure alone', () => {
    const { across } = animalsSummary([
      ...[day('a', 1, Number.NaN), day('b', 1, 0.5), day('c', 1, 0.7)],
    ]);
    expect(across.lickShare).toMatchObject({ n: 2, estimate: 0.6 });
    expect(across.lapsPerMinute.n).toBe(3);
    expect(acrossAnimals([], 's')).toMatchObject({ n: 0, estimate: Number.NaN });
  });

  it('the order in which sessions are named changes nothing, and the mean lies in its interval', () => {
    const some = fc.array(
      fc.record({
        subject: fc.constantFrom('a', 'b', 'c', 'd', 'e'),
        number: fc.integer({ min: 1, max: 28 }),
        share: fc.double({ min: 0, max: 1, noNaN: true }),
      }),
      { minLength: 2, maxLength: 20 },
    );
    fc.assert(
      fc.property(some, (sessions) => {
        const distinct = new Map(sessions.map((s) => [`${s.subject} ${s.number}`, s]));
        const days = [...distinct.values()].map((s) => day(s.subject, s.number, s.share));
        const found = animalsSummary(days);
        expect(animalsSummary([...days].reverse())).toEqual(found);
        const { n, estimate, low, high } = found.across.lickShare;
        if (n < 2) return;
        expect(low).toBeLessThanOrEqual(estimate + 1e-12);
        expect(high).toBeGreaterThanOrEqual(estimate - 1e-12);
      }),
      { seed: 11, numRuns: 30 },
    );
  });
});

describe('the page across animals', () => {
  const days = ['a', 'b', '<c>'].flatMap((subject, i) =>
    [1, 2, 3].map((n) => day(subject, n, 0.2 + 0.1 * i + 0.15 * n)),
  );
  const page = animalsPage(days);

  it('stands by itself, shows every animal, and says what the unit is', () => {
    expect(page).not.toMatch(/<script|https?:|url\(|NaN|Infinity|undefined/);
    expect(page.match(/<svg/g)).toHaveLength(4);
    for (const subject of ['a', 'b', '&lt;c&gt;']) expect(page).toContain(`<td>${subject}</td>`);
    expect(page).toContain('The unit is the animal');
    expect(animalsPage(days)).toBe(page);
  });

  it('warns of few animals, of single sessions and of different rules files', () => {
    expect(page).toContain('Only 3 animals');
    expect(page).not.toContain('One session only');
    const mixed = animalsPage([day('a', 1, 0.5), { ...day('b', 2, 0.6), title: 'Other' }]);
    expect(mixed).toContain('One session only, so no change: a, b.');
    expect(mixed).toContain('different rules files: Water at a place, Other.');
  });
});
