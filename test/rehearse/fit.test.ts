/** The estimators find again what simulated sessions were made with, within stated tolerances. */
import { describe, expect, test } from 'vitest';
import { individual } from '../../hardware-sim/animal/individual.js';
import { ANIMAL, type AnimalParameters } from '../../hardware-sim/animal/parameters.js';
import { type Estimate, estimate } from '../../server/rehearse/fit/estimate.js';
import { observe } from '../../server/rehearse/fit/observe.js';
import { simulatedSession } from './simulated.js';

type Key = keyof AnimalParameters;
/** Hours of session are simulated: many seconds on a busy machine. */
const SLOW = { timeout: 120_000 };

function fitted(animal: AnimalParameters, trained: boolean, sessions: number, minutes = 25) {
  const observed = Array.from({ length: sessions }, (_, n) =>
    observe(simulatedSession({ subject: 'a', seed: n + 1, trained, minutes, animal }), 1200),
  );
  return new Map(estimate(observed).map((found): [Key, Estimate] => [found.key, found]));
}

/** Largest error that is accepted, as a share of the true value. */
const TOLERANCE: Partial<Record<Key, number>> = {
  slowestCruiseCmPerS: 0.1,
  fastestCruiseCmPerS: 0.1,
  boutS: 0.25,
  pauseS: 0.2,
  groomChance: 0.4,
  backChance: 0.4,
  burstCmPerS: 0.1,
  burstChance: 0.4,
  slowestLickHz: 0.05,
  fastestLickHz: 0.05,
  shortestContactMs: 0.1,
  longestContactMs: 0.05,
  dryLicks: 0.25,
  drinkLicks: 0.1,
  drinkS: 0.2,
  anticipationCm: 0.1,
  spoutCmPerS: 0.3,
  slowingCm: 0.3,
  trainedBoutsPerS: 0.4,
};

const OTHER: AnimalParameters = {
  ...ANIMAL,
  ...{ boutS: 15, pauseS: 4, slowestCruiseCmPerS: 10, fastestCruiseCmPerS: 18 },
  ...{ slowestLickHz: 6.5, fastestLickHz: 7.5, shortestContactMs: 25, longestContactMs: 60 },
  ...{ spoutCmPerS: 8, slowingCm: 35, anticipationCm: 14, drinkS: 2.4, drinkLicks: 18 },
  ...{ dryLicks: 6, trainedBoutsPerS: 0.03, groomChance: 0.15, backChance: 0.15, burstCmPerS: 55 },
};

describe('the fit of a trained animal', SLOW, () => {
  test.each([
    ['the usual one', ANIMAL],
    ['another one', OTHER],
  ])('finds the parameters of %s', (_, animal) => {
    const found = fitted(animal, true, 5);
    for (const [key, tolerance] of Object.entries(TOLERANCE) as [Key, number][]) {
      const error = found.get(key)!.value / animal[key] - 1;
      expect(Math.abs(error), `${key}: ${found.get(key)!.value}`).toBeLessThan(tolerance);
    }
  });
});

describe('the fit of a naive animal', SLOW, () => {
  const slow = { ...ANIMAL, naiveMissChance: 0, naiveBoutsPerS: 0.5, learningPerDrop: 0.03 };
  test.each([
    ['as fast as usual', { ...ANIMAL, naiveMissChance: 0 }],
    ['slowly', slow],
  ])('finds how much it licks and how fast it learns, learning %s', (_, animal) => {
    const found = fitted(animal, false, 9, 15);
    for (const key of ['naiveBoutsPerS', 'learningPerDrop'] as const) {
      const error = found.get(key)!.value / animal[key] - 1;
      expect(Math.abs(error), `${key}: ${found.get(key)!.value}`).toBeLessThan(0.5);
    }
  });
});

describe('the fit of several animals', SLOW, () => {
  const of = (kind: AnimalParameters) => {
    const observed = Array.from({ length: 12 }, (_, n) => {
      const animal = individual(kind, n);
      const subject = `animal ${n}`;
      return observe(
        simulatedSession({ subject, seed: n + 1, trained: true, minutes: 6, animal }),
        1200,
      );
    });
    return estimate(observed).find(({ key }) => key === 'betweenAnimals')!.value;
  };

  test('tells animals that differ from animals that do not', () => {
    const alike = of({ ...ANIMAL, betweenAnimals: 0 });
    const unlike = of({ ...ANIMAL, betweenAnimals: 0.3 });
    expect(alike).toBeLessThan(0.1);
    expect(unlike).toBeGreaterThan(0.15);
    expect(unlike).toBeLessThan(0.5);
  });

  test('says nothing from too few bouts, licks or animals', () => {
    const one = simulatedSession({
      ...{ subject: 'a', seed: 1, trained: true, minutes: 1, animal: ANIMAL },
    });
    const keys = estimate([observe(one, 1200)]).map(({ key }) => key);
    expect(keys).not.toContain('betweenAnimals');
    expect(keys).not.toContain('groomChance');
    expect(keys).not.toContain('boutS');
  });
});
