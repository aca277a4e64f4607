import { inOrder, MEASURES, type Measure } from '../../analysis/acrossAnimals.js';
import type { LearningDay } from '../../analysis/learning.js';
import { fixed, table } from './htmlTable.js';
import { LEARNED_EXPLAINED, MEASURE_WORDS, MEASURES_EXPLAINED } from './measures.js';
import { STYLE } from './page.js';
import { escapeHtml, INK, Plot, type Point } from './plot.js';

/** Learning across the sessions of one subject, in order of their start: one HTML page. */
export function learningPage(days: readonly LearningDay[]): string {
  const ordered = inOrder(days);
  const { subject } = ordered[0]!;
  const title = `${subject}: ${ordered.length} sessions`;
  const rows = ordered.map((day, i) => [
    ...[i + 1, day.startedAt.slice(0, 16).replace('T', ' '), fixed(day.minutes, 1), day.laps],
    ...MEASURES.map((measure) => fixed(day[measure], MEASURE_WORDS[measure].digits)),
    fixed(day.learnedAtLap, 0) || '-',
  ]);
  const measures = MEASURES.map((measure) => MEASURE_WORDS[measure].short);
  const head = ['', 'started', 'min', 'laps', ...measures, 'learned at lap'];
  return [
    `<!doctype html>\n<html lang="en"><head><meta charset="utf-8"><title>${escapeHtml(title)}</title>`,
    `<style>${STYLE}</style></head><body><h1>${escapeHtml(title)}</h1>`,
    table(head, rows),
    ...MEASURES.map((measure) => figure(ordered, measure)),
    `<p>${MEASURES_EXPLAINED} ${LEARNED_EXPLAINED} Shaded: the 95 % interval over the laps of that session, by ` +
      `bootstrap (Efron and Tibshirani 1993). One animal: across animals the unit is the animal, not the lap or the ` +
      'session, and `lapwing report` over sessions of several compares them so.</p></body></html>\n',
  ].join('\n');
}

function figure(days: readonly LearningDay[], measure: Measure): string {
  const { label, most } = MEASURE_WORDS[measure];
  const points = days.map((day, i): Point => [i + 1, day[measure]]);
  const shaded = measure === 'lickShare' || measure === 'slowing' ? measure : undefined;
  const bounds = shaded === undefined ? [] : days.map(({ overLaps }) => overLaps[shaded]);
  const values = [...days.map((day) => day[measure]), ...bounds.map(({ high }) => high)];
  const top = most ?? Math.max(1e-9, ...values.filter(Number.isFinite)) * 1.1;
  const x = { label: 'session', from: 0.5, to: days.length + 0.5, whole: true };
  const plot = new Plot(`${label} by session`, x, { label, from: 0, to: top }, 180);
  plot.band(
    bounds.map(({ low, high }, i) => [i + 1, low, high]),
    INK.blue,
  );
  return `<figure>${plot.curve(points, INK.blue).marks(points, 'dot', INK.blue)}</figure>`;
}
