import {
  ANIMAL,
  type AnimalParameters,
  PARAMETERS,
} from '../../../hardware-sim/animal/parameters.js';
import { median, quantile, robustLine } from '../../analysis/align/robustLine.js';
import type { Observed } from './observe.js';
import { RESTS_BELOW, RUNS_ABOVE } from './stretches.js';

type Key = keyof AnimalParameters;

/** One parameter as the sessions show it. */
export interface Estimate {
  readonly key: Key;
  readonly value: number;
  /** Of how many bouts, pauses, licks or laps. */
  readonly n: number;
  /** The estimator, in words. */
  readonly how: string;
}

/** A normal distribution's standard deviation over its median absolute deviation. */
const MAD_TO_SD = 1.4826;
/** An exponential distribution's mean over its median. */
const EXPONENTIAL = 1 / Math.LN2;
/** Fewer than these say too little. */
const LEAST_N = 8;
const LEAST_ANIMALS = 4;
const EARLY_DROPS = 10;
/** Lick bouts per second away from the spout that only a naive animal makes. */
const NAIVE_PER_S = 0.08;
/** Speeds near the spout are taken in slices this wide. */
const SLICE_CM = 1;
const LINE_TO_CM = 14;
const LINE_FROM_CM = 2;

/**
 * Estimates the animal's parameters from what sessions showed: medians and quantiles throughout, so
 * that some odd bouts and laps move little. What sessions show too seldom is left out.
 */
export function estimate(sessions: readonly Observed[]): Estimate[] {
  const found: Estimate[] = [];
  const tell = (key: Key, value: number, n: number, how: string, least = LEAST_N) => {
    if (n < least || !Number.isFinite(value)) return;
    const { least: low, most } = PARAMETERS[key];
    found.push({ key, value: Math.min(most, Math.max(low, value)), n, how });
  };
  const all = (of: (session: Observed) => readonly number[]) => sessions.flatMap(of);
  const total = (of: (session: Observed) => number) => sessions.reduce((sum, s) => sum + of(s), 0);

  const cruise = all((s) => s.cruise);
  const cruises = uniformBounds(cruise);
  tell('slowestCruiseCmPerS', cruises.from, cruise.length, BOUNDS);
  tell('fastestCruiseCmPerS', cruises.to, cruise.length, BOUNDS);
  const speed = median(cruise);
  resting(sessions, speed, tell);
  const bursts = all((s) => s.bursts);
  const runningS = total((s) => s.runningS);
  // A burst goes to between three quarters of the highest speed and the whole.
  tell('burstCmPerS', median(bursts) / 0.875, bursts.length, 'median peak of bursts, over 0.875');
  tell(
    'burstChance',
    bursts.length / (runningS / 0.5),
    bursts.length,
    'bursts per half second of running',
  );

  const hz = all((s) => s.lickHz);
  const rates = uniformBounds(hz);
  tell('slowestLickHz', rates.from, hz.length, BOUNDS);
  tell('fastestLickHz', rates.to, hz.length, BOUNDS);
  const contacts = all((s) => s.contactsMs);
  const touches = uniformBounds(contacts);
  tell('shortestContactMs', touches.from, contacts.length, BOUNDS);
  tell('longestContactMs', touches.to, contacts.length, BOUNDS);
  const dryLicks = all((s) => s.dryLicks);
  tell('dryLicks', 1 + (trimmedMean(dryLicks) - 1) / TRIMMED, dryLicks.length, TRIMMED_HOW);
  const drinkLicks = all((s) => s.drinkLicks);
  tell('drinkLicks', median(drinkLicks), drinkLicks.length, 'median');
  const drinkS = all((s) => s.drinkS);
  tell('drinkS', median(drinkS) / MEAN_DRINK, drinkS.length, 'median time at rest after a drop');
  const anticipation = all((s) => s.anticipation);
  tell('anticipationCm', median(anticipation), anticipation.length, 'median of the first licks');
  approaching(sessions, speed, tell);
  learning(sessions, tell);
  between(sessions, tell);
  return found;
}

type Tell = (key: Key, value: number, n: number, how: string, least?: number) => void;

const BOUNDS = '5 % and 95 % quantiles, widened as an even distribution asks';
const TRIMMED_HOW = 'mean without the longest 5 %, widened as an exponential asks';
/** An exponential distribution's mean without its longest 5 %, over the whole mean. */
const TRIMMED = 1 - (0.05 * Math.log(20)) / 0.95;
/** It drinks for 0.7 to 1.4 times its mean. */
const MEAN_DRINK = 1.05;

/** Lengths of bouts and pauses, corrected for pauses too short to be seen as rests. */
function resting(sessions: readonly Observed[], speed: number, tell: Tell): void {
  const sum = (of: (session: Observed) => number) => sessions.reduce((all, s) => all + of(s), 0);
  const pauses = sessions.flatMap((s) => s.pauses);
  const pauseS = median(pauses) * EXPONENTIAL;
  // Speed takes this long to fall below what is seen as rest; a shorter pause goes unseen.
  const fallS = ANIMAL.responseS * Math.log(speed / RESTS_BELOW);
  const riseS = ANIMAL.responseS * Math.log(speed / (speed - RUNS_ABOVE));
  const unseen = Math.exp(fallS / pauseS);
  tell('pauseS', pauseS, pauses.length, 'median over ln 2: exponential');
  const grooms = sum((s) => s.grooms);
  const ends = (sum((s) => s.runEnds) - grooms) * unseen + grooms;
  const bouts = sum((s) => s.runEnds);
  const runS = sum((s) => s.runS) - bouts * (fallS - riseS);
  tell('boutS', runS / ends, bouts, 'running over ends that no drop caused, unseen pauses added');
  const ordinary = pauses.length * unseen;
  tell('groomChance', grooms / (grooms + ordinary), grooms, 'rests with touches of a paw', 3);
  const backs = sum((s) => s.backs);
  tell('backChance', Math.min(1, backs / ordinary), backs, 'rests with a step back', 3);
}

/** Slowing: a straight line through the median speeds just before the spout. */
function approaching(sessions: readonly Observed[], speed: number, tell: Tell): void {
  const slices = new Map<number, number[]>();
  let plateau: number[] = [];
  for (const { approach } of sessions) {
    for (const [ahead, at] of approach) {
      if (ahead > 40) plateau.push(at);
      if (ahead < LINE_FROM_CM || ahead > LINE_TO_CM) continue;
      const slice = Math.floor(ahead / SLICE_CM);
      const speeds = slices.get(slice) ?? [];
      speeds.push(at);
      slices.set(slice, speeds);
    }
  }
  const laps = sessions.reduce((sum, { anticipation }) => sum + anticipation.length, 0);
  if (slices.size < 6 || plateau.length === 0) return;
  if (plateau.length > 20_000) plateau = plateau.filter((_, n) => n % 7 === 0);
  const far = median(plateau);
  const places = [...slices.keys()].map((slice) => (slice + 0.5) * SLICE_CM);
  const line = robustLine(
    places,
    [...slices.values()].map((speeds) => median(speeds)),
  );
  // Speed lags behind what the animal wants by its response.
  const lag = 1 + line.slope * ANIMAL.responseS;
  const wants = { offset: line.offset / lag, slope: line.slope / lag };
  const eager = ANIMAL.trainedSkill;
  const spout = (wants.offset - (1 - eager) * far) / eager;
  if (!(wants.slope > 0) || !(far > spout)) return;
  const how = 'Huber line through median speeds 2 to 14 cm before the spout';
  tell('spoutCmPerS', spout, laps, how);
  tell('slowingCm', (eager * (Math.max(far, speed) - spout)) / wants.slope, laps, how);
}

/**
 * Lick bouts away from the spout: their rate falls with each drop by a constant factor, found by
 * maximum likelihood of Poisson counts over sessions that began naive; in the others it is level.
 */
function learning(sessions: readonly Observed[], tell: Tell): void {
  const naive = sessions.filter(beganNaive);
  const trained = sessions.filter((session) => !beganNaive(session));
  const [bouts, seconds] = totals(trained.flatMap(({ dry }) => dry));
  tell('trainedBoutsPerS', bouts / seconds, bouts, 'lick bouts per second of running away', 5);
  const drops = trained.reduce((sum, s) => sum + s.drops, 0);
  const missed = trained.reduce((sum, s) => sum + s.missed, 0);
  tell('trainedMissChance', missed / drops, drops, 'drops not licked within 3 s', 50);
  if (naive.length === 0) return;
  const { share, rate } = bestNaiveFit(naive);
  const [count] = totals(naive.flatMap(({ dry }) => dry));
  const how = 'Poisson likelihood of lick bouts away from the spout, drop by drop';
  tell('naiveBoutsPerS', rate, count, how, 20);
  tell('learningPerDrop', share, count, how, 20);
}

/** It licked away from the spout often at first: more than any trained animal, and than later. */
function beganNaive({ dry }: Observed): boolean {
  const [earlyBouts, earlyS] = totals(dry.slice(0, EARLY_DROPS));
  const [lateBouts, lateS] = totals(dry.slice(EARLY_DROPS));
  const rate = earlyBouts / Math.max(1, earlyS);
  return rate > NAIVE_PER_S && rate > 2 * (lateBouts / Math.max(1, lateS));
}

interface NaiveFit {
  readonly likelihood: number;
  /** Of what is still to be learned, taught by a drop. */
  readonly share: number;
  /** Lick bouts per second at first. */
  readonly rate: number;
}

/** The likeliest of a grid of shares and levels, the first rate by expectation-maximisation in each. */
function bestNaiveFit(sessions: readonly Observed[]): NaiveFit {
  let best: NaiveFit = { likelihood: Number.NEGATIVE_INFINITY, share: 0, rate: 0 };
  for (let share = 0.005; share <= 0.3; share += 0.0025) {
    for (let level = 0; level <= 0.05; level += 0.005) {
      const fit = naiveFit(sessions, share, level);
      if (fit.likelihood > best.likelihood) best = fit;
    }
  }
  return best;
}

const ROUNDS = 15;

function naiveFit(sessions: readonly Observed[], share: number, level: number): NaiveFit {
  let rate = 0.3;
  let likelihood = 0;
  for (let round = 0; round < ROUNDS; round++) {
    let bouts = 0;
    let weighted = 0;
    likelihood = 0;
    for (const { dry } of sessions) {
      let weight = 1;
      for (const [count, seconds] of dry) {
        const naive = rate * weight;
        const expected = seconds * (naive + level);
        if (expected > 0) {
          likelihood += count * Math.log(expected) - expected;
          bouts += (count * naive) / (naive + level);
        }
        weighted += seconds * weight;
        weight *= (1 - share) ** 2;
      }
    }
    rate = bouts / weighted;
  }
  return { likelihood, share, rate };
}

/** Spread between animals: of the logarithm of their cruising speeds, which sessions show best. */
function between(sessions: readonly Observed[], tell: Tell): void {
  const bySubject = new Map<string, number[]>();
  for (const { subject, cruise } of sessions) {
    bySubject.set(subject, [...(bySubject.get(subject) ?? []), ...cruise]);
  }
  const logs = [...bySubject.values()]
    .filter(({ length }) => length > 0)
    .map((c) => Math.log(median(c)));
  const centre = median(logs);
  const deviation = MAD_TO_SD * median(logs.map((log) => Math.abs(log - centre)));
  const how = 'median absolute deviation of log cruising speed, times 1.4826';
  tell('betweenAnimals', deviation, logs.length, how, LEAST_ANIMALS);
}

/** Where an even distribution begins and ends, from its 5 % and 95 % quantiles. */
function uniformBounds(values: readonly number[]): { from: number; to: number } {
  const low = quantile(values, 0.05);
  const high = quantile(values, 0.95);
  const beyond = ((high - low) * 0.05) / 0.9;
  return { from: low - beyond, to: high + beyond };
}

function trimmedMean(values: readonly number[]): number {
  const most = quantile(values, 0.95);
  const kept = values.filter((value) => value <= most);
  return kept.reduce((sum, value) => sum + value, 0) / kept.length;
}

function totals(pairs: readonly (readonly [number, number])[]): [number, number] {
  return pairs.reduce<[number, number]>((sum, [a, b]) => [sum[0] + a, sum[1] + b], [0, 0]);
}
