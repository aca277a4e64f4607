import { meanOf, xorshift } from '../analysis/bootstrap.js';
import { LapwingError } from '../errors/codes.js';
import { type LapLicks, lickShare } from '../rehearse/lapLicks.js';
import { animalsNeeded, type Design, type DrawAnimal, type Power } from './power.js';

export interface PowerQuestion {
  readonly design: Design;
  /** Of lick share, between the conditions. */
  readonly difference: number;
  readonly alpha: number;
  /** The power wanted. */
  readonly power: number;
  /** Laps of each animal under each condition; a row of the plan each. */
  readonly laps: readonly number[];
  readonly seed: number;
}

export interface PlanRow {
  readonly laps: number;
  /** Sessions that so many complete laps take, the median one. */
  readonly sessions: number;
  /** Of animals' shares measured over so many laps. */
  readonly mean: number;
  readonly sd: number;
  /** In each group, or in all where each is under both conditions; null: more than 400. */
  readonly animals: number | null;
  readonly reached: Power | null;
}

export interface PowerPlan extends Omit<PowerQuestion, 'laps' | 'seed'> {
  readonly rows: readonly PlanRow[];
  /** Animals that the plan rests on: rehearsed sessions with licks. */
  readonly animalsSeen: number;
  readonly notes: readonly string[];
}

const LEAST_ANIMALS = 20;
const SD_DRAWS = 2_000;

/**
 * How many animals it takes to find a difference in lick share, for several numbers of laps. Animals
 * are drawn from the rehearsed ones, and laps from each one's own, both with replacement.
 * @param animals the complete laps of each rehearsed session
 * @throws LapwingError PLAN_TOO_FEW
 */
export function planPower(
  animals: readonly (readonly LapLicks[])[],
  question: PowerQuestion,
): PowerPlan {
  const { laps, seed, ...asked } = question;
  const seen = animals.filter((own) => Number.isFinite(lickShare(own)));
  if (seen.length < LEAST_ANIMALS) {
    throw new LapwingError(
      'planTooFew',
      `${seen.length} of ${animals.length} sessions have complete laps with licks; ${LEAST_ANIMALS} are needed.`,
    );
  }
  const counts = seen.map(({ length }) => length).sort((a, b) => a - b);
  const usual = counts[Math.floor(counts.length / 2)]!;
  const rows = laps.map((count) => {
    const draw = drawingLaps(seen, count, seed);
    const { mean, sd } = spreadOf(draw, seed);
    const found = animalsNeeded(asked, asked.power, draw, seed);
    return {
      ...{ laps: count, sessions: Math.ceil(count / usual), mean, sd },
      ...{ animals: found?.animals ?? null, reached: found?.power ?? null },
    };
  });
  const beyond = rows.some(({ mean }) => mean + question.difference > 1);
  return {
    ...{ ...asked, rows, animalsSeen: seen.length },
    notes: beyond ? [BEYOND, ...NOTES] : NOTES,
  };
}

const BEYOND =
  'No share exceeds 100 %, and these are so high already that the difference does not fit: ask for less, or plan for a loss.';
const NOTES: readonly string[] = [
  'The animal is the unit: laps of one animal make its share surer and are no sample of animals.',
  'The difference is added to the share, the same for every animal; real effects differ too.',
  'Simulated animals are no measurement: fit the animal to your own (`lapwing animal fit`) first.',
  'How many animals may be used, and what is done to them, is for the approved protocol to say.',
];

/** Shares made beforehand of each animal's laps: drawing laps anew each time costs seconds. */
const POOL = 48;

/** Draws an animal, and for each condition a share over so many of its own laps. */
export function drawingLaps(
  animals: readonly (readonly LapLicks[])[],
  laps: number,
  seed: number,
): DrawAnimal {
  const random = xorshift(seed);
  const pools = animals.map((own) =>
    Array.from({ length: POOL }, () => shareOf(own, laps, random)),
  );
  return (chance) => {
    const pool = pools[Math.floor(chance() * pools.length)]!;
    const one = Math.floor(chance() * POOL);
    // Another one for the other condition: each has its own laps.
    const other = (one + 1 + Math.floor(chance() * (POOL - 1))) % POOL;
    return [pool[one]!, pool[other]!];
  };
}

function shareOf(own: readonly LapLicks[], laps: number, random: () => number): number {
  let near = 0;
  let all = 0;
  for (let n = 0; n < laps; n++) {
    const lap = own[Math.floor(random() * own.length)]!;
    near += lap[0];
    all += lap[1];
  }
  // Not one lick on so few laps: the animal's own share stands for it.
  return all === 0 ? lickShare(own) : near / all;
}

function spreadOf(draw: DrawAnimal, seed: number): { mean: number; sd: number } {
  const random = xorshift(seed);
  const shares = Array.from({ length: SD_DRAWS }, () => draw(random)[0]);
  const mean = meanOf(shares);
  return { mean, sd: Math.sqrt(meanOf(shares.map((share) => (share - mean) ** 2))) };
}
