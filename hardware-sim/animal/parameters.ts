/**
 * How the simulated animal behaves, in one table: the file that `--animal` takes has these lines,
 * `lapwing animal show` prints them and `lapwing animal fit` sets them from real sessions. Every
 * value is `common practice, no source`: what people who run head-fixed mice on a belt expect to
 * see, not a measurement of ours.
 */

/** Units as they stand in the file; a parameter is kept in its own unit, a `%` as a share. */
export type ParameterUnit = 'cm/s' | 'cm' | 's' | 'ms' | 'Hz' | 'uL' | '%' | 'licks' | 'per s';

export interface Parameter {
  /** In the file. */
  readonly name: string;
  readonly value: number;
  readonly unit: ParameterUnit;
  readonly least: number;
  readonly most: number;
  readonly meaning: string;
}

function parameter(
  name: string,
  value: number,
  unit: ParameterUnit,
  [least, most]: readonly [number, number],
  meaning: string,
): Parameter {
  return { name, value, unit, least, most, meaning };
}

export const PARAMETERS = {
  // Running.
  slowestCruiseCmPerS: parameter(
    'slowest_cruise',
    14,
    'cm/s',
    [1, 100],
    "a bout's cruising speed is drawn between this",
  ),
  fastestCruiseCmPerS: parameter('fastest_cruise', 28, 'cm/s', [1, 100], 'and this'),
  burstCmPerS: parameter(
    'burst_speed',
    60,
    'cm/s',
    [1, 150],
    'now and then it bursts up to this speed',
  ),
  burstChance: parameter(
    'burst_chance',
    0.015,
    '%',
    [0, 1],
    'chance of a burst in each stride of half a second',
  ),
  responseS: parameter(
    'response',
    0.25,
    's',
    [0.02, 5],
    'speed follows what the animal wants with this time constant',
  ),
  strideSpread: parameter(
    'stride_spread',
    0.2,
    '%',
    [0, 0.9],
    "a stride's speed differs from the cruising speed by at most this share",
  ),
  boutS: parameter('bout', 9, 's', [1.5, 600], 'mean length of a running bout when thirsty'),
  pauseS: parameter('pause', 2.5, 's', [0.1, 600], 'mean length of a pause when thirsty'),
  backChance: parameter(
    'back_chance',
    0.3,
    '%',
    [0, 1],
    'chance that a pause ends with a small step back',
  ),
  backMostCm: parameter('back_most', 1.5, 'cm', [0.3, 20], 'the longest step back'),
  backCmPerS: parameter('back_speed', 4, 'cm/s', [0.5, 30], 'its speed'),
  groomChance: parameter(
    'groom_chance',
    0.08,
    '%',
    [0, 1],
    'chance that a pause turns into grooming, which touches the lick sensor',
  ),
  groomLeastMs: parameter('groom_least', 800, 'ms', [100, 60_000], 'for this long'),
  groomMostMs: parameter('groom_most', 3000, 'ms', [100, 60_000], 'up to this'),

  // Licking.
  slowestLickHz: parameter(
    'slowest_licks',
    5.5,
    'Hz',
    [1, 20],
    "a lick bout's rate is drawn between this",
  ),
  fastestLickHz: parameter('fastest_licks', 8.5, 'Hz', [1, 20], 'and this'),
  shortestContactMs: parameter(
    'shortest_contact',
    15,
    'ms',
    [1, 500],
    'the tongue touches for this long',
  ),
  longestContactMs: parameter('longest_contact', 80, 'ms', [1, 500], 'up to this'),
  dryLicks: parameter(
    'dry_licks',
    4,
    'licks',
    [1, 100],
    'licks in a bout without water, on average',
  ),
  drinkLicks: parameter('drink_licks', 12, 'licks', [1, 200], 'licks after a drop, on average'),
  naiveBoutsPerS: parameter(
    'naive_bouts',
    0.35,
    'per s',
    [0, 5],
    'lick bouts that a naive animal begins per second of running, wherever it is',
  ),
  trainedBoutsPerS: parameter(
    'trained_bouts',
    0.01,
    'per s',
    [0, 5],
    'what is left of them in a trained one',
  ),

  // At the spout.
  slowingCm: parameter(
    'slowing',
    25,
    'cm',
    [1, 200],
    "a trained animal slows over this distance before the spout's place",
  ),
  spoutCmPerS: parameter('spout_speed', 4, 'cm/s', [0.5, 60], 'down to this speed'),
  anticipationCm: parameter(
    'anticipation',
    9,
    'cm',
    [0, 100],
    'and begins to lick this far before it, on average',
  ),
  drinkS: parameter(
    'drinking',
    1.6,
    's',
    [0.1, 30],
    'it stands still to drink for this long, on average',
  ),
  sipUl: parameter('sip', 1.2, 'uL', [0.05, 20], 'water that one lick takes'),
  naiveMissChance: parameter(
    'naive_misses',
    0.25,
    '%',
    [0, 1],
    'chance that a naive animal runs on past a drop, which then hangs at the spout',
  ),
  trainedMissChance: parameter(
    'trained_misses',
    0.01,
    '%',
    [0, 1],
    'what is left of it in a trained one',
  ),

  // Learning and thirst.
  trainedSkill: parameter(
    'trained_skill',
    0.95,
    '%',
    [0, 1],
    'how sure a trained animal is of the place: 0 naive, 100 % certain',
  ),
  learningPerDrop: parameter(
    'learning',
    0.06,
    '%',
    [0, 0.5],
    'share of what is still to be learned that one drop at the expected place teaches',
  ),
  samePlaceCm: parameter(
    'same_place',
    12,
    'cm',
    [1, 100],
    'how far a drop may fall from the expected place and still confirm it',
  ),
  quenchedUl: parameter(
    'quenched',
    1200,
    'uL',
    [10, 10_000],
    'water that quenches the thirst wholly',
  ),
  idleBelowThirst: parameter(
    'idle_below',
    0.05,
    '%',
    [0, 1],
    'share of the first thirst below which it stops running',
  ),
  betweenAnimals: parameter(
    'between_animals',
    0.2,
    '%',
    [0, 1],
    'spread (SD) of these from animal to animal, where several are rehearsed',
  ),
} satisfies Record<string, Parameter>;

export type AnimalParameters = { readonly [K in keyof typeof PARAMETERS]: number };

/** The animal where nothing else is said. */
export const ANIMAL: AnimalParameters = Object.fromEntries(
  Object.entries(PARAMETERS).map(([key, { value }]) => [key, value]),
) as unknown as AnimalParameters;
