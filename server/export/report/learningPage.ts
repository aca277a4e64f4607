import type { LearningDay } from '../../analysis/learning.js';
import { STYLE } from './page.js';
import { escapeHtml, INK, Plot, type Point } from './plot.js';
import { fixed, table } from './tables.js';

/** Learning across the sessions of one subject, in order of their start: one HTML page. */
export function learningPage(days: readonly LearningDay[]): string {
  const ordered = [...days].sort((a, b) => Date.parse(a.startedAt) - Date.parse(b.startedAt));
  const { subject } = ordered[0]!;
  const title = `${subject}: ${ordered.length} sessions`;
  const rows = ordered.map((day, i) => [
    ...[i + 1, day.startedAt.slice(0, 16).replace('T', ' '), fixed(day.minutes, 1), day.laps],
    ...[fixed(day.lapsPerMinute, 2), fixed(day.lickShare, 2), fixed(day.slowing, 2)],
    fixed(day.waterUl, 1),
  ]);
  const head = ['', 'started', 'min', 'laps', 'laps/min', 'lick share', 'slowing', 'water (uL)'];
  return [
    `<!doctype html>\n<html lang="en"><head><meta charset="utf-8"><title>${escapeHtml(title)}</title>`,
    `<style>${STYLE}</style></head><body><h1>${escapeHtml(title)}</h1>`,
    table(head, rows),
    figure(ordered, 'laps a minute', (day) => day.lapsPerMinute),
    figure(ordered, 'lick share', (day) => day.lickShare, 1),
    figure(ordered, 'slowing', (day) => day.slowing),
    figure(ordered, 'water (uL)', (day) => day.waterUl),
    '<p>Lick share: of the licks that do not drink a drop, those at the spout (5 cm to each side) or ' +
      'in the 20 cm before it. Slowing: median over laps of the speed in those 20 cm over the speed ' +
      'on the rest of the belt; below 1 it slows. Complete laps that nobody left out. One animal: ' +
      'across animals the unit is the animal, not the lap or the session.</p></body></html>\n',
  ].join('\n');
}

function figure(
  days: readonly LearningDay[],
  label: string,
  of: (day: LearningDay) => number,
  most?: number,
): string {
  const points = days.map((day, i): Point => [i + 1, of(day)]);
  const top = most ?? Math.max(1e-9, ...points.map(([, y]) => y).filter(Number.isFinite)) * 1.1;
  const x = { label: 'session', from: 0.5, to: days.length + 0.5, whole: true };
  const plot = new Plot(`${label} by session`, x, { label, from: 0, to: top }, 180);
  return `<figure>${plot.curve(points, INK.blue).marks(points, 'dot', INK.blue)}</figure>`;
}
