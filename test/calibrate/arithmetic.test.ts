import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { robustly } from '../../server/calibrate/statistics/outliers.js';
import { bandAt, fitLine } from '../../server/calibrate/statistics/straightLine.js';
import { studentT, studentWithin } from '../../server/calibrate/statistics/studentT.js';
import {
  ALARM_PERCENT,
  checkValve,
  fitValve,
  NoLine,
} from '../../server/calibrate/valve/valveFit.js';
import { volumeOfMassUl, waterDensity } from '../../server/calibrate/valve/water.js';
import { CERTIFIED, NORRIS_X, NORRIS_Y } from './norris.js';

describe('a least-squares line', () => {
  it('has the certified values of the NIST reference data Norris to ten digits', () => {
    const line = fitLine(NORRIS_X, NORRIS_Y);
    for (const [name, certified] of Object.entries(CERTIFIED)) {
      const found = line[name as keyof typeof CERTIFIED];
      expect(Math.abs(found / certified - 1), name).toBeLessThan(1e-10);
    }
    expect(line.freedom).toBe(34);
  });

  it('goes through points that lie on one, wherever they are', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: -1_000, max: 1_000 }),
        fc.integer({ min: -1_000, max: 1_000 }),
        fc.uniqueArray(fc.integer({ min: -500, max: 500 }), { minLength: 3, maxLength: 20 }),
        (offset, slope, x) => {
          const line = fitLine(
            x,
            x.map((value) => offset + slope * value),
          );
          expect(line.slope).toBeCloseTo(slope, 8);
          expect(line.offset).toBeCloseTo(offset, 5);
          expect(bandAt(line, 17)).toBeCloseTo(0, 5);
        },
      ),
      { seed: 4, numRuns: 200 },
    );
  });

  it('is refused for two points, and for points at one x', () => {
    expect(() => fitLine([1, 2], [1, 2])).toThrow('three points');
    expect(() => fitLine([5, 5, 5], [1, 2, 3])).toThrow('different x');
  });
});

describe("Student's t", () => {
  // NIST/SEMATECH e-Handbook of Statistical Methods, table 1.3.6.7.2, two-sided 95 and 99 %.
  it.each([
    [1, 12.706, 63.657],
    [2, 4.303, 9.925],
    [3, 3.182, 5.841],
    [4, 2.776, 4.604],
    [7, 2.365, 3.499],
    [10, 2.228, 3.169],
    [30, 2.042, 2.75],
  ])('with %i degrees of freedom is as tabulated', (freedom, at95, at99) => {
    expect(studentT(0.95, freedom)).toBeCloseTo(at95, 3);
    expect(studentT(0.99, freedom)).toBeCloseTo(at99, 3);
  });

  // Closed forms: 2/pi atan t for one degree, t / sqrt(2 + t^2) for two.
  it('has the closed forms of one and two degrees of freedom', () => {
    for (const t of [0.1, 1, 3, 20]) {
      expect(studentWithin(t, 1)).toBeCloseTo((2 / Math.PI) * Math.atan(t), 12);
      expect(studentWithin(t, 2)).toBeCloseTo(t / Math.sqrt(2 + t * t), 12);
    }
  });

  it('says nothing where no freedom is left', () => {
    expect(studentT(0.95, 0)).toBeNaN();
  });
});

describe('outliers by the median absolute deviation', () => {
  it('are the values that lie far from the rest, however many digits the rest agree in', () => {
    const found = robustly([4500, 4501, 4499, 9001, 4500, 4502, 2250], 0.4);
    expect(found.median).toBe(4500);
    expect(found.outlying).toEqual([false, false, false, true, false, false, true]);
  });

  it('are none where all differ by less than a count can show', () => {
    expect(robustly([4500, 4500, 4500, 4501], 0.41).outlying).toEqual([false, false, false, false]);
  });
});

describe('the density of water', () => {
  /** G. S. Kell, Journal of Chemical and Engineering Data 20 (1975) 97, equation 16, g/mL. */
  function kell(t: number): number {
    const above =
      999.83952 +
      t *
        (16.945176 +
          t * (-7.9870401e-3 + t * (-46.170461e-6 + t * (105.56302e-9 + t * -280.54253e-12))));
    return above / (1 + 16.87985e-3 * t) / 1000;
  }

  // Metrologia 38 (2001) 301, table 1, from memory.
  it('is as the CIPM recommends', () => {
    expect(waterDensity(4)).toBeCloseTo(0.999975, 6);
    expect(waterDensity(20)).toBeCloseTo(0.998207, 6);
    expect(waterDensity(25)).toBeCloseTo(0.997047, 6);
  });

  it('agrees with another published formula to five parts in a million', () => {
    for (let t = 5; t <= 40; t++) {
      expect(Math.abs(waterDensity(t) / kell(t) - 1), `${t} C`).toBeLessThan(5e-6);
    }
  });

  // ISO 8655-6, factor Z at 20 C and 101.3 kPa: 1.0029 uL/mg, from memory.
  it('makes 1 mg at 20 C on a balance 1.0029 uL', () => {
    expect(volumeOfMassUl(1, 20)).toBeCloseTo(1.0029, 4);
  });
});

describe("a valve's calibration", () => {
  const weighings = [
    [20, 99.1],
    [20, 101.2],
    [50, 348],
    [50, 352.9],
    [90, 684.5],
    [90, 679],
    [150, 1181],
    [150, 1189.5],
  ].map(([ms, massMg]) => ({ openUs: ms! * 1_000, drops: 100, massMg: massMg! }));
  const fit = fitValve(weighings, 21);

  // scipy 1.17.1: linregress on the same volumes, t.ppf(0.975, 6) for the band.
  it('has the slope, offset, errors and band that a general library finds', () => {
    expect(fit.line.slope).toBeCloseTo(0.08369265715452891, 12);
    expect(fit.line.offset).toBeCloseTo(-674.4234568230131, 8);
    expect(fit.line.slopeError).toBeCloseTo(0.00025899265275060475, 12);
    expect(fit.line.offsetError).toBeCloseTo(23.701719373231363, 8);
    expect(fit.line.r2).toBeCloseTo(0.9999425451794826, 12);
    const bands = fit.points.map((point) => point.bandNl);
    [47.74069106051465, 35.42670648611681, 31.84464850210164, 55.3382845703268].forEach((nl, i) => {
      expect(bands[2 * i]!).toBeCloseTo(nl, 8);
    });
    expect(fit.deadUs).toBeCloseTo(8058.334861776075, 6);
    expect(fit.usPerNl).toBeCloseTo(11.948479520175999, 9);
  });

  it('reaches from the smallest drop measured to the largest, and no further', () => {
    const volumes = fit.points.map((point) => point.dropNl);
    expect(fit.leastNl).toBeGreaterThanOrEqual(Math.min(...volumes));
    expect(fit.mostNl).toBeLessThanOrEqual(Math.max(...volumes));
  });

  it('tells the scatter between weighings of one open time', () => {
    // By hand: pairs differ by 2.1, 1.4, 0.81 and 0.72 % of their mean; pooled over sqrt(2).
    expect(fit.repeatPercent).toBeCloseTo(0.96, 1);
    expect(
      fitValve(
        weighings.filter((_, i) => i % 2 === 0),
        21,
      ).repeatPercent,
    ).toBeNull();
  });

  it('is refused, with the reason, where the points make no valve', () => {
    expect(() => fitValve(weighings.slice(0, 4), 21)).toThrow(NoLine);
    const dry = weighings.map((one) => ({ ...one, massMg: 0 }));
    expect(() => fitValve(dry, 21)).toThrow('some water');
    const swapped = weighings.map((one, i) => ({ ...one, massMg: weighings[7 - i]!.massMg }));
    expect(() => fitValve(swapped, 21)).toThrow('no more water');
  });

  it('finds a valve again from drops that follow a line exactly', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 0, max: 15_000 }),
        fc.integer({ min: 4, max: 40 }),
        fc.integer({ min: 8, max: 35 }),
        (deadUs, usPerNl, celsius) => {
          const exact = [1_000, 3_000, 6_000, 12_000].map((nl) => ({
            openUs: deadUs + nl * usPerNl,
            drops: 100,
            massMg: nl / 10 / volumeOfMassUl(1, celsius),
          }));
          const found = fitValve(exact, celsius);
          expect(found.deadUs).toBeCloseTo(deadUs, 3);
          expect(found.usPerNl).toBeCloseTo(usPerNl, 8);
          // Whole nL, on the safe side.
          expect(12_000 - found.mostNl).toBeLessThanOrEqual(1);
        },
      ),
      { seed: 6, numRuns: 100 },
    );
  });

  it('is alarmed about beyond ten percent, and no sooner', () => {
    const line = { deadUs: 8_000, usPerNl: 12 };
    const drops = (share: number) => ({
      openUs: 8_000 + 4_000 * 12,
      drops: 100,
      massMg: (share * 400) / volumeOfMassUl(1, 21),
    });
    expect(checkValve(drops(1.04), 21, line)).toMatchObject({ verdict: 'good' });
    expect(checkValve(drops(0.94), 21, line)).toMatchObject({ verdict: 'warn' });
    expect(checkValve(drops(1.099), 21, line)).toMatchObject({ verdict: 'warn' });
    const alarm = checkValve(drops(0.89), 21, line);
    expect(alarm.verdict).toBe('alarm');
    expect(alarm.offPercent).toBeCloseTo(-11, 6);
    expect(alarm.expectedNl).toBeCloseTo(4_000, 9);
    expect(ALARM_PERCENT).toBe(10);
  });
});
