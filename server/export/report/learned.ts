import { learnedOf, omissionsOf } from '../../analysis/learned.js';
import { LEARNED } from '../../rules/learned.js';
import type { Shown } from './figures.js';
import { fixed, table } from './htmlTable.js';
import { LEARNED_EXPLAINED } from './measures.js';

/** Whether the animal has learned where the water comes, by the stated criterion; and laps without water. */
export function learned(shown: Shown): string {
  const { laps, profile, licking } = shown;
  const found = learnedOf(laps, profile, licking);
  if (found === undefined) return '<p>No water at a known place: nothing to have learned.</p>';
  const { fromCm, toCm, firstLap, met, of } = found;
  const where = `${fixed(fromCm, 0)} to ${fixed(toCm, 0)} cm`;
  const verdict =
    of === 0
      ? `Fewer than ${LEARNED.laps} complete laps: the criterion could not be asked.`
      : firstLap === null
        ? `It was learned at the end of none of ${of} laps.`
        : `It was learned first at the end of lap ${firstLap}, and at the end of ${met} of ${of} laps.`;
  return [
    `<p>${verdict} The 25 cm up to the water are ${where}. ${LEARNED_EXPLAINED}</p>`,
    omissions(shown),
  ].join('\n');
}

function omissions({ licking, drops }: Shown): string {
  const rows = omissionsOf(licking, drops);
  if (rows.some(({ laps }) => laps === 0)) return '';
  return table(
    ['', 'laps', 'waiting licks a lap', 'share at the spout or before it'],
    rows.map((row) => [
      row.water ? 'laps with water' : 'laps without (omission)',
      row.laps,
      fixed(row.licksPerLap, 1),
      fixed(row.share, 2),
    ]),
  );
}
