import { spawnSync } from 'node:child_process';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { FieldPredictor } from '../../server/plasticity/fieldPrediction.js';
import {
  AFTER_TAU_S,
  BEFORE_TAU_S,
  gaussianSteps,
  kernelSteps,
  smallDecay,
} from '../../server/plasticity/kernel.js';
import { PositionTrail, WINDOW_STEPS } from '../../server/plasticity/positionTrail.js';

const LONG_BELT_CM = 2_000;

/** Belt moved since the onset at one speed, at the middle of each 10 ms step. */
function evenRun(speedCmPerS: number): Float64Array {
  return Float64Array.from({ length: WINDOW_STEPS }, (_, n) => {
    return speedCmPerS * (-3 + (n + 0.5) * 0.01);
  });
}

/** Slope of the least-squares line. */
function slope(x: readonly number[], y: readonly number[]): number {
  const mx = x.reduce((a, b) => a + b) / x.length;
  const my = y.reduce((a, b) => a + b) / y.length;
  const xy = x.reduce((sum, value, n) => sum + (value - mx) * (y[n]! - my), 0);
  return xy / x.reduce((sum, value) => sum + (value - mx) ** 2, 0);
}

describe('the plasticity window', () => {
  test('its decay is that of the exponential function', () => {
    for (let x = 0; x <= 1; x += 1 / 64) expect(smallDecay(x)).toBeCloseTo(Math.exp(-x), 14);
  });

  test('sums to its closed form, a truncated double exponential', () => {
    const sum = kernelSteps().reduce((total, weight) => total + weight * 0.01, 0);
    const before = BEFORE_TAU_S * (1 - Math.exp(-3 / BEFORE_TAU_S));
    const after = AFTER_TAU_S * (1 - Math.exp(-1 / AFTER_TAU_S));
    expect(sum).toBeCloseTo(before + after, 4);
  });

  test('the tuning is a Gaussian of the stated spread, and sums to one', () => {
    const side = gaussianSteps(15, 0.9);
    const whole = [...side.slice(1)].reverse().concat([...side]);
    const centre = side.length - 1;
    expect(whole.reduce((a, b) => a + b)).toBeCloseTo(1, 12);
    const variance = whole.reduce((sum, w, n) => sum + w * ((n - centre) * 0.9) ** 2, 0);
    // Cut off at four standard deviations, which takes a tenth of a percent of the variance.
    expect(Math.sqrt(variance)).toBeCloseTo(15, 1);
    expect(side[10]! / side[0]!).toBeCloseTo(Math.exp(-(9 ** 2) / (2 * 15 ** 2)), 12);
  });
});

describe('a predicted field', () => {
  test('of an animal that stands still is the inputs\u2019 own tuning about the onset', () => {
    const field = new FieldPredictor(LONG_BELT_CM).predict(evenRun(0), 600)!;
    expect(field.peakCm).toBeCloseTo(600, 6);
    expect(field.centreCm).toBeCloseTo(600, 6);
    expect(field.shiftCm).toBeCloseTo(0, 6);
    expect(field.asymmetry).toBeCloseTo(0, 6);
    // A Gaussian of standard deviation 15 cm times the root of two, cut at a fifth of its height:
    // in closed form 2 sd sqrt(2 ln 5).
    expect(field.widthCm).toBeCloseTo(2 * 15 * Math.SQRT2 * Math.sqrt(2 * Math.log(5)), 1);
  });

  test('with narrow inputs has the closed form of the window run at one speed', () => {
    for (const speed of [10, 20, 40]) {
      const field = new FieldPredictor(LONG_BELT_CM, 1).predict(evenRun(speed), 1_000)!;
      // The window falls to a fifth after tau ln 5 on each side; after the onset that is cut off
      // at one second.
      const back = speed * BEFORE_TAU_S * Math.log(5);
      const ahead = speed * Math.min(1, AFTER_TAU_S * Math.log(5));
      expect(Math.abs(field.widthCm - (back + ahead))).toBeLessThan(0.08 * (back + ahead) + 1);
      expect(field.asymmetry).toBeGreaterThan(0.2);
    }
  });

  // common practice, no source
  test('grows with running speed by about 2.5 s, and peaks some 10 cm before the onset', () => {
    const predictor = new FieldPredictor(LONG_BELT_CM);
    const speeds = [10, 15, 20, 25, 30, 40];
    const fields = speeds.map((speed) => predictor.predict(evenRun(speed), 1_000)!);
    const perS = slope(
      speeds,
      fields.map(({ widthCm }) => widthCm),
    );
    expect(perS).toBeGreaterThan(2.2);
    expect(perS).toBeLessThan(2.8);
    for (const [n, { shiftCm, centreCm }] of fields.entries()) {
      if (speeds[n]! < 15) continue;
      expect(shiftCm).toBeGreaterThan(5);
      expect(shiftCm).toBeLessThan(15);
      expect(1_000 - centreCm).toBeGreaterThan(shiftCm);
    }
  });

  test('is numpy\u2019s convolution of the window with the tuning', (context) => {
    const script = `
import json, sys, numpy as np
moved, length, onset = json.load(sys.stdin)
n = round(length); h = length / n
t = -3 + (np.arange(400) + .5) * .01
k = np.where(t < 0, np.exp(t / 1.31), np.exp(-t / .69))
at = (onset + np.array(moved)) / h
low = np.floor(at).astype(int)
d = np.zeros(n)
np.add.at(d, low % n, k * (1 - (at - low)))
np.add.at(d, (low + 1) % n, k * (at - low))
x = np.minimum(np.arange(n), n - np.arange(n)) * h
g = np.exp(-x**2 / (4 * 15**2)); g /= g.sum()
print(json.dumps(list(np.fft.ifft(np.fft.fft(d) * np.fft.fft(g)).real)))`;
    const moved = evenRun(23).map((cm, n) => cm + 3 * Math.sin(n / 30));
    const answer = spawnSync('python3', ['-c', script], {
      input: JSON.stringify([[...moved], 180.4, 45]),
      encoding: 'utf8',
    });
    // numpy comes with Debian's python3-h5py, which the test command installs where it may.
    if (answer.status !== 0) return context.skip('python3 with numpy is not to be had here');
    const predictor = new FieldPredictor(180.4);
    predictor.predict(moved, 45);
    const reference = JSON.parse(answer.stdout) as number[];
    const top = Math.max(...reference);
    // Numpy's Gaussian goes all the way round, ours to four standard deviations.
    for (const [n, value] of reference.entries()) {
      expect(Math.abs(predictor.curve[n]! - value)).toBeLessThan(top * 1e-3);
    }
  });

  test('moves with the onset, whatever the place on the belt and over the seam', () => {
    const predictor = new FieldPredictor(180);
    const base = predictor.predict(evenRun(20), 90)!;
    fc.assert(
      fc.property(fc.integer({ min: 0, max: 179 }), (onsetCm) => {
        const field = predictor.predict(evenRun(20), onsetCm)!;
        expect(field.widthCm).toBeCloseTo(base.widthCm, 6);
        expect(field.shiftCm).toBeCloseTo(base.shiftCm, 6);
        expect(field.peakCm).toBeGreaterThanOrEqual(0);
        expect(field.peakCm).toBeLessThan(180);
      }),
      { seed: 71, numRuns: 60 },
    );
  });

  test('of an animal that ran round the whole belt is as wide as the belt', () => {
    const field = new FieldPredictor(60).predict(evenRun(60), 10)!;
    expect(field.widthCm).toBe(60);
  });

  test('is not made when less than half of the window is known', () => {
    const moved = evenRun(20);
    moved.fill(Number.NaN, 0, 201);
    expect(new FieldPredictor(180).predict(moved, 20)).toBeUndefined();
    moved[200] = -20;
    expect(new FieldPredictor(180).predict(moved, 20)).toBeDefined();
  });
});

describe('the trail of positions', () => {
  test('gives back an even run, however the frames came', () => {
    fc.assert(
      fc.property(
        fc.array(fc.integer({ min: 1_000, max: 40_000 }), { minLength: 400, maxLength: 900 }),
        (gaps) => {
          const trail = new PositionTrail();
          let nowUs = 0;
          for (const gap of gaps) {
            nowUs += gap;
            trail.note(nowUs, nowUs / 1_000);
          }
          const onsetUs = nowUs - 1_100_000;
          const into = new Float64Array(WINDOW_STEPS);
          trail.about(onsetUs, into);
          for (const [n, travel] of into.entries()) {
            if (Number.isNaN(travel)) continue;
            expect(travel).toBeCloseTo((onsetUs - 3_000_000 + (n + 0.5) * 10_000) / 1_000, 6);
          }
          if (nowUs > 4_200_000) expect([...into].some(Number.isNaN)).toBe(false);
        },
      ),
      { seed: 72, numRuns: 40 },
    );
  });

  test('knows nothing of before it was cleared', () => {
    const trail = new PositionTrail();
    for (let ms = 0; ms < 5_000; ms += 5) trail.note(ms * 1_000, ms);
    trail.clear();
    const into = new Float64Array(WINDOW_STEPS);
    trail.about(3_500_000, into);
    expect([...into].every(Number.isNaN)).toBe(true);
  });
});
