import { describe, expect, test } from 'vitest';
import { xorshift } from '../../server/analysis/bootstrap.js';
import { drawingLaps, type PowerQuestion, planPower } from '../../server/plan/lickSharePlan.js';
import { animalsNeeded, type DrawAnimal, simulatedPower } from '../../server/plan/power.js';
import type { LapLicks } from '../../server/rehearse/lapLicks.js';

/** Standard normal by Box and Muller (Annals of Mathematical Statistics 29, 1958). */
const normal = (random: () => number) =>
  Math.sqrt(-2 * Math.log(1 - random())) * Math.cos(2 * Math.PI * random());
const twoNormals: DrawAnimal = (random) => [normal(random), normal(random)];
const SEED = 0x5eed_1234;

describe('power by simulation', () => {
  /*
   * Exact power of the t test from the noncentral t distribution, scipy 1.17.1 `stats.nct`. The
   * numbers of animals are those of J. Cohen, Statistical Power Analysis for the Behavioral
   * Sciences, 1988, table 2.4.1 (from memory): 64, 26 and 17 a group for d of 0.5, 0.8 and 1.0.
   */
  test.each([
    [0.5, 64, 0.8015],
    [0.8, 26, 0.8075],
    [1.0, 17, 0.807],
    [1.5, 6, 0.6496],
    [0.2, 50, 0.1677],
  ])('of two groups agrees with the t test: d %f, %i animals', (difference, animals, exact) => {
    const experiment = { design: 'between', animals, difference, alpha: 0.05 } as const;
    const { power, standardError } = simulatedPower(experiment, twoNormals, SEED, 6_000);
    expect(Math.abs(power - exact)).toBeLessThan(4 * standardError);
  });

  // As above; a difference of two independent normals has a deviation of sqrt 2.
  test.each([
    [0.5, 34, 0.8078],
    [1.0, 10, 0.8031],
    [0.8, 15, 0.8213],
  ])('of pairs agrees with the paired t test: d %f, %i animals', (d, animals, exact) => {
    const difference = d * Math.SQRT2;
    const experiment = { design: 'within', animals, difference, alpha: 0.05 } as const;
    const { power, standardError } = simulatedPower(experiment, twoNormals, SEED, 6_000);
    expect(Math.abs(power - exact)).toBeLessThan(4 * standardError);
  });

  test('of no difference is the chance of a false alarm', () => {
    for (const design of ['between', 'within'] as const) {
      const experiment = { design, animals: 8, difference: 0, alpha: 0.05 };
      const { power, standardError } = simulatedPower(experiment, twoNormals, SEED, 6_000);
      expect(Math.abs(power - 0.05)).toBeLessThan(4 * standardError);
    }
  });

  test('finds the numbers of animals in the table, within the simulation', () => {
    const needed = (difference: number) => {
      const experiment = { design: 'between', difference, alpha: 0.05 } as const;
      return animalsNeeded(experiment, 0.8, twoNormals, SEED)!.animals;
    };
    expect(needed(1.0)).toBeGreaterThanOrEqual(15);
    expect(needed(1.0)).toBeLessThanOrEqual(19);
    expect(needed(0.5)).toBeGreaterThanOrEqual(57);
    expect(needed(0.5)).toBeLessThanOrEqual(71);
  });

  test('gives up on what 400 animals would not show', () => {
    const experiment = { design: 'between', difference: 0.01, alpha: 0.05 } as const;
    expect(animalsNeeded(experiment, 0.8, twoNormals, SEED)).toBeUndefined();
  });
});

/** Animals whose laps have ten licks each, near the spout with the animal's own chance. */
function animalsOf(between: number, count = 60): LapLicks[][] {
  return Array.from({ length: count }, (_, animal) => {
    const own = 0.5 + between * Math.sin(animal * 2.399963);
    return Array.from({ length: 80 }, (__, lap): LapLicks => {
      const near = Math.floor(10 * own + ((lap * 0.618034) % 1));
      return [near, 10];
    });
  });
}

describe('a plan for lick share', () => {
  const question: PowerQuestion = {
    ...{ design: 'between', difference: 0.1, alpha: 0.05, power: 0.8 },
    ...{ laps: [5, 50], seed: SEED },
  };

  test('asks for no fewer animals where animals differ, however many laps each runs', () => {
    const alike = planPower(animalsOf(0), question);
    const unlike = planPower(animalsOf(0.15), question);
    expect(alike.rows[0]!.animals!).toBeLessThan(unlike.rows[0]!.animals!);
    const [few, many] = unlike.rows;
    expect(many!.animals!).toBeLessThanOrEqual(few!.animals!);
    // The deviation between animals stays: 0.15 / sqrt 2 of a sine.
    expect(many!.sd).toBeCloseTo(0.15 / Math.SQRT2, 2);
    // By the t test, that deviation takes 19 a group.
    expect(many!.animals!).toBeGreaterThan(15);
    expect(many!.animals!).toBeLessThan(23);
  });

  test('asks for fewer where each animal is its own control', () => {
    const animals = animalsOf(0.15);
    const between = planPower(animals, question).rows[1]!.animals!;
    const within = planPower(animals, { ...question, design: 'within' }).rows[1]!.animals!;
    expect(within).toBeLessThan(between / 2);
  });

  test('tells how many sessions so many laps take', () => {
    const { rows } = planPower(animalsOf(0.1), { ...question, laps: [80, 81, 200] });
    expect(rows.map(({ sessions }) => sessions)).toEqual([1, 2, 3]);
  });

  test('is the same for the same seed', () => {
    expect(planPower(animalsOf(0.1), question)).toEqual(planPower(animalsOf(0.1), question));
  });

  test('says that a share cannot grow beyond all of it', () => {
    const high = { ...question, difference: 0.6 };
    expect(planPower(animalsOf(0.1), high).notes[0]).toMatch(/100 %/);
    expect(planPower(animalsOf(0.1), question).notes[0]).not.toMatch(/100 %/);
  });

  test('draws each condition from other laps of the same animal', () => {
    const draw = drawingLaps(animalsOf(0.15), 5, SEED);
    const random = xorshift(7_000_001);
    const pairs = Array.from({ length: 400 }, () => draw(random));
    expect(pairs.some(([one, other]) => one !== other)).toBe(true);
    const apart = pairs.map(([one, other]) => Math.abs(one - other));
    expect(Math.max(...apart)).toBeLessThan(0.15);
  });

  test('is refused where too few animals licked at all', () => {
    const silent = animalsOf(0.1).map((laps, n) =>
      n < 45 ? laps.map((): LapLicks => [0, 0]) : laps,
    );
    expect(() => planPower(silent, question)).toThrow(/15 of 60 sessions/);
  });
});
