import {
  type AcrossAnimals,
  type Animal,
  acrossAnimals,
  animalsOf,
  bySession,
  MEASURES,
  type Measure,
} from '../../analysis/acrossAnimals.js';
import type { LearningDay } from '../../analysis/learning.js';
import { fixed, table } from './htmlTable.js';
import { MEASURE_WORDS, MEASURES_EXPLAINED } from './measures.js';
import { STYLE } from './page.js';
import { escapeHtml, INK, Plot, type Point } from './plot.js';

/** Fewer animals than this say little of others: their interval is too narrow (common practice). */
const FEW = 6;

/** What several animals have in common, the unit being the animal: for people and for scripts. */
export interface AnimalsSummary {
  readonly animals: readonly Animal[];
  readonly across: Readonly<Record<Measure, AcrossAnimals>>;
  /** Last session less first. */
  readonly change: Readonly<Record<Measure, AcrossAnimals>>;
}

export function animalsSummary(days: readonly LearningDay[]): AnimalsSummary {
  const animals = animalsOf(days);
  const seed = seedText(animals);
  const each = (of: (animal: Animal, measure: Measure) => number) =>
    Object.fromEntries(
      MEASURES.map((measure) => [
        measure,
        acrossAnimals(
          animals.map((animal) => of(animal, measure)),
          seed,
        ),
      ]),
    ) as Record<Measure, AcrossAnimals>;
  return {
    animals,
    across: each(({ mean }, measure) => mean[measure]),
    change: each(({ change }, measure) => change[measure]),
  };
}

/** The same animals give the same intervals, in whatever order they are named. */
function seedText(animals: readonly Animal[]): string {
  return animals.map(({ subject }) => subject).join('\n');
}

/** Sessions of several animals compared: one HTML page. */
export function animalsPage(days: readonly LearningDay[]): string {
  const { animals, across, change } = animalsSummary(days);
  const title = `${animals.length} animals, ${days.length} sessions`;
  const head = MEASURES.map((measure) => MEASURE_WORDS[measure].short);
  const digits = (measure: Measure) => MEASURE_WORDS[measure].digits;
  const rows = animals.map(({ subject, days: own, mean }) => [
    ...[subject, own.length, own.reduce((sum, { laps }) => sum + laps, 0)],
    ...MEASURES.map((measure) => fixed(mean[measure], digits(measure))),
  ]);
  const interval = ({ estimate, low, high }: AcrossAnimals, places: number) =>
    Number.isNaN(low)
      ? fixed(estimate, places)
      : `${fixed(estimate, places)} (${fixed(low, places)} to ${fixed(high, places)})`;
  const summary = MEASURES.map((measure) => [
    ...[MEASURE_WORDS[measure].label, across[measure].n],
    interval(across[measure], digits(measure)),
    ...[change[measure].n, interval(change[measure], digits(measure))],
  ]);
  return [
    `<!doctype html>\n<html lang="en"><head><meta charset="utf-8"><title>${escapeHtml(title)}</title>`,
    `<meta name="viewport" content="width=device-width"><style>${STYLE}</style></head><body>`,
    `<h1>${escapeHtml(title)}</h1>`,
    cautions(animals),
    '<h2>Across animals</h2>',
    table(
      ['', 'animals', 'mean (95 % interval)', 'animals', 'last session less first (95 % interval)'],
      summary,
    ),
    '<h2>Each animal</h2>',
    table(['animal', 'sessions', 'laps', ...head], rows),
    '<p>Means over the sessions of each animal, each session counting the same.</p>',
    '<h2>Session by session</h2>',
    ...MEASURES.map((measure) => figure(animals, measure)),
    '<p>Grey: each animal. Blue: the mean over animals; shaded, its 95 % interval, where at least ' +
      'three animals have such a session.</p>',
    `<p>${MEASURES_EXPLAINED} The unit is the animal: each counts once, however many sessions and ` +
      'laps it has, for those of one animal are alike (Lazic, BMC Neuroscience 11:5, 2010). ' +
      'Intervals: percentile bootstrap over animals, 2000 rounds, seeded by their names (Efron and ' +
      'Tibshirani 1993, chapter 13).</p></body></html>\n',
  ].join('\n');
}

function cautions(animals: readonly Animal[]): string {
  const found: string[] = [];
  const single = animals.filter(({ days }) => days.length < 2);
  if (animals.length < FEW)
    found.push(
      `Only ${animals.length} animals: the intervals are narrower than they should be, and say ` +
        'little of animals that were not recorded.',
    );
  if (single.length > 0)
    found.push(
      `One session only, so no change: ${single.map(({ subject }) => subject).join(', ')}.`,
    );
  const titles = new Set(animals.flatMap(({ days }) => days.map(({ title }) => title)));
  if (titles.size > 1)
    found.push(`The sessions ran different rules files: ${[...titles].join(', ')}.`);
  if (found.length === 0) return '';
  return `<ul>${found.map((caution) => `<li>${escapeHtml(caution)}</li>`).join('')}</ul>`;
}

function figure(animals: readonly Animal[], measure: Measure): string {
  const { label, most } = MEASURE_WORDS[measure];
  const mean = bySession(animals, measure, seedText(animals));
  const values = animals.flatMap(({ days }) => days.map((day) => day[measure]));
  const top = most ?? Math.max(1e-9, ...values.filter(Number.isFinite)) * 1.1;
  const x = { label: 'session', from: 0.5, to: mean.length + 0.5, whole: true };
  const plot = new Plot(`${label} by session`, x, { label, from: 0, to: top }, 200);
  for (const { days } of animals) {
    const points = days.map((day, i): Point => [i + 1, day[measure]]);
    plot.curve(points, INK.grey).marks(points, 'ring', INK.grey);
  }
  const points = mean.map(({ session, estimate }): Point => [session, estimate]);
  plot.band(
    mean.map(({ session, n, low, high }) =>
      n < 3 ? [session, Number.NaN, Number.NaN] : [session, low, high],
    ),
    INK.blue,
  );
  return `<figure>${plot.curve(points, INK.blue).marks(points, 'dot', INK.blue)}</figure>`;
}
