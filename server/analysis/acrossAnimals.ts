import { bootstrap, type Interval, meanOf, seedOf } from './bootstrap.js';
import type { LearningDay } from './learning.js';

/** What is compared across animals: fields of `LearningDay`. */
export const MEASURES = ['lapsPerMinute', 'lickShare', 'slowing', 'waterUl'] as const;
export type Measure = (typeof MEASURES)[number];

/** One animal: a single value of each measure, whatever the number of its sessions and laps. */
export interface Animal {
  readonly subject: string;
  /** Its sessions in order. */
  readonly days: readonly LearningDay[];
  /** Mean over its sessions; NaN where no session has a value. */
  readonly mean: Readonly<Record<Measure, number>>;
  /** Its last session's value less its first's; NaN with one session. */
  readonly change: Readonly<Record<Measure, number>>;
}

/** A mean over animals with its interval; bounds are NaN for fewer than two animals. */
export interface AcrossAnimals extends Interval {
  /** Animals that have a value. */
  readonly n: number;
}

/** Sessions gathered by animal, in the order of the animals' names. */
export function animalsOf(days: readonly LearningDay[]): Animal[] {
  const subjects = [...new Set(days.map(({ subject }) => subject))].sort();
  return subjects.map((subject) => {
    const own = inOrder(days.filter((day) => day.subject === subject));
    const each = (of: (values: readonly number[]) => number) =>
      Object.fromEntries(
        MEASURES.map((measure) => [measure, of(own.map((day) => day[measure]))]),
      ) as Record<Measure, number>;
    return {
      ...{ subject, days: own },
      mean: each((values) => meanOf(values.filter(Number.isFinite))),
      change: each((values) => (values.length < 2 ? Number.NaN : values.at(-1)! - values[0]!)),
    };
  });
}

export function inOrder(days: readonly LearningDay[]): LearningDay[] {
  return [...days].sort((a, b) => Date.parse(a.startedAt) - Date.parse(b.startedAt));
}

/**
 * The mean over animals and its 95 % interval. The unit is the animal: values are one an animal, and
 * the bootstrap draws animals (laps and sessions of one animal are no independent evidence: S. E.
 * Lazic, BMC Neuroscience 11:5, 2010).
 * @param values one an animal; those that are not finite are left out
 * @param seed the same text gives the same interval
 */
export function acrossAnimals(values: readonly number[], seed: string): AcrossAnimals {
  const known = values.filter(Number.isFinite);
  const n = known.length;
  const nothing = { low: Number.NaN, high: Number.NaN, standardError: Number.NaN };
  if (n < 2) return { n, estimate: n === 0 ? Number.NaN : known[0]!, ...nothing };
  return { n, ...bootstrap(known, meanOf, seedOf(seed)) };
}

/** The mean over animals at each one's first, second, ... session. */
export function bySession(animals: readonly Animal[], measure: Measure, seed: string) {
  const most = Math.max(...animals.map(({ days }) => days.length));
  return Array.from({ length: most }, (_, i) => {
    const values = animals.flatMap(({ days }) => (i < days.length ? [days[i]![measure]] : []));
    return { session: i + 1, ...acrossAnimals(values, seed) };
  });
}
