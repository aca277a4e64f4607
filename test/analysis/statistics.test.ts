import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { quantile } from '../../server/analysis/align/robustLine.js';
import { bootstrap, meanOf } from '../../server/analysis/bootstrap.js';
import { circularSummary } from '../../server/analysis/circular.js';
import {
  isBetween,
  type Profile,
  speedBetween,
  speedByPosition,
} from '../../server/analysis/profile.js';

describe('places on a closed belt', () => {
  it('have the mean, the resultant length and the p that R gives', () => {
    // Angles in degrees are places on a belt of 360 cm. The first set is a textbook's worked example
    // (Zar, Biostatistical Analysis: mean 99 degrees, r 0.82522; from memory). The numbers are those
    // of R 4.2.2 with Debian's r-cran-circular 0.4-95: mean, rho.circular, rayleigh.test.
    const zar = circularSummary([45, 55, 81, 96, 110, 117, 132, 154], 360);
    expect(zar.meanCm).toBeCloseTo(98.987752, 5);
    expect(zar.resultantLength).toBeCloseTo(0.825217744820045, 12);
    expect(zar.pValue).toBeCloseTo(0.00164419739511717, 12);
    const spread = circularSummary([10, 80, 150, 200, 290, 300, 20, 95, 260, 170, 40], 360);
    expect(spread.meanCm).toBeCloseTo(46.1015166244438, 9);
    expect(spread.resultantLength).toBeCloseTo(0.0858614635946332, 12);
    expect(spread.pValue).toBeCloseTo(0.925338480584557, 12);
    // Beyond 50 places p is found otherwise.
    const many = (of: (i: number) => number) =>
      circularSummary(
        Array.from({ length: 64 }, (_, i) => of(i)),
        360,
      );
    const gathered = many((i) => ((i * 37) % 360) * 0.4 + i);
    expect(gathered.meanCm).toBeCloseTo(99.568275622498, 9);
    expect(gathered.resultantLength).toBeCloseTo(0.706878200148142, 12);
    expect(gathered.pValue / 1.29288577116948e-14).toBeCloseTo(1, 9);
    const loose = many((i) => ((i * 73.7) % 360) * 0.85);
    expect(loose.meanCm).toBeCloseTo(147.271914695436, 9);
    expect(loose.pValue).toBeCloseTo(0.18445998038856, 12);
  });

  it('turn with the belt: only the mean place changes', () => {
    const places = fc.array(fc.double({ min: 0, max: 179.9, noNaN: true }), {
      minLength: 3,
      maxLength: 40,
    });
    fc.assert(
      fc.property(places, fc.double({ min: 0, max: 180, noNaN: true }), (cm, by) => {
        const still = circularSummary(cm, 180);
        fc.pre(still.resultantLength > 0.01);
        const turned = circularSummary(
          cm.map((place) => (place + by) % 180),
          180,
        );
        expect(turned.resultantLength).toBeCloseTo(still.resultantLength, 9);
        expect(turned.pValue).toBeCloseTo(still.pValue, 9);
        const moved = (turned.meanCm! - still.meanCm! - by + 540) % 180;
        expect(Math.min(moved, 180 - moved)).toBeLessThan(1e-6);
      }),
      { seed: 2, numRuns: 100 },
    );
  });

  it('that are none, or opposite, have no mean', () => {
    expect(circularSummary([], 180)).toMatchObject({ n: 0, meanCm: null, pValue: 1 });
    expect(circularSummary([0, 90], 180).meanCm).toBeNull();
  });

  it('may lie in a stretch across 0 cm', () => {
    expect([175, 3, 10, 90].map((cm) => isBetween(cm, 170, 10))).toEqual([
      true,
      true,
      false,
      false,
    ]);
  });
});

describe('the bootstrap', () => {
  // Efron and Tibshirani (1993), table 2.1: survival of treated mice; standard error of the mean
  // for endless rounds 23.36 (from memory; it is also the plug-in formula, computed below).
  const mice = [94, 197, 16, 38, 99, 141, 23];

  it("gives the textbook's standard error of a mean", () => {
    const found = bootstrap(mice, meanOf, 5, 0.95, 20_000);
    const mean = meanOf(mice);
    const plugIn = Math.sqrt(meanOf(mice.map((value) => (value - mean) ** 2)) / mice.length);
    expect(plugIn).toBeCloseTo(23.36, 2);
    expect(found.standardError).toBeGreaterThan(0.97 * 23.36);
    expect(found.standardError).toBeLessThan(1.03 * 23.36);
    expect(found.estimate).toBeCloseTo(86.857, 3);
  });

  it('covers the truth about as often as it says', () => {
    let covered = 0;
    const draws = fc.array(fc.integer({ min: 0, max: 1_000_000 }), {
      minLength: 30,
      maxLength: 30,
    });
    fc.sample(fc.noBias(draws), { seed: 6, numRuns: 200 }).forEach((sample, i) => {
      const { low, high } = bootstrap(sample, meanOf, i + 1, 0.95, 400);
      if (low <= 500_000 && high >= 500_000) covered++;
    });
    expect(covered / 200).toBeGreaterThan(0.88);
    expect(covered / 200).toBeLessThan(0.99);
  });

  it('is the same for the same seed, and another for another', () => {
    const at = (seed: number) => bootstrap(mice, meanOf, seed);
    expect(at(1)).toEqual(at(1));
    expect(at(1).low).not.toBe(at(2).low);
  });
});

describe('quantiles', () => {
  it("are R's type 7", () => {
    // R: quantile(c(1, 2, 4, 8, 16), c(0.1, 0.5, 0.9)) gives 1.4, 4.0, 12.8 (Hyndman and Fan 1996).
    expect([0.1, 0.5, 0.9].map((p) => quantile([8, 1, 16, 4, 2], p))).toEqual([1.4, 4, 12.8]);
  });
});

describe('speed by position', () => {
  const lap = (seconds: number[], travelCm: number[]) => ({
    ...{ lap: 1, seconds: Float64Array.from(seconds), travelCm: Float64Array.from(travelCm) },
  });
  const profile: Profile = {
    ...{ binCm: 60, bins: 3 },
    laps: [lap([1, 2, 0], [10, 60, 0]), lap([3, 2, 4], [90, 20, 40])],
  };

  it('is the mean over time, and its spread that of the laps', () => {
    // By hand: 100 cm in 4 s; laps at 10 and 30 cm/s have a standard deviation of 14.142.
    const [first, , third] = speedByPosition(profile);
    expect(first!.meanCmPerS).toBe(25);
    expect(first!.spreadCmPerS).toBeCloseTo(Math.SQRT2 * 10, 12);
    expect(third!.meanCmPerS).toBe(10);
    expect(third!.spreadCmPerS).toBeNaN();
  });

  it('between two places may go across 0 cm', () => {
    expect(speedBetween(profile, profile.laps[1]!, 120, 60)).toBeCloseTo(130 / 7, 12);
    expect(speedBetween(profile, profile.laps[0]!, 120, 180)).toBeNaN();
  });
});
