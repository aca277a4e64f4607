import type { SourceSpan, Sum } from '../../ast.js';
import { formatQuantity } from '../../units.js';
import type { Check, CheckContext } from '../check.js';
import { intervalOf, intervalOfChoices } from '../interval.js';
import { namesIn, walk } from '../walk.js';

/** Places off the belt, and places that differ in shape from phase to phase. */
export const onBelt: Check = (context) => {
  const { file, symbols, problems } = context;
  for (const { place } of file.places) {
    for (const { value } of place.exceptions) {
      if ((value.to === undefined) === (place.base.to === undefined)) continue;
      problems.report('wrongKind', value.at, 'a point in one phase and a span in another', {
        expected: place.base.to ? 'a span' : 'a point',
        also: [{ at: place.base.at, note: 'elsewhere it is this' }],
      });
    }
    for (const spot of [place.base, ...place.exceptions.map(({ value }) => value)]) {
      inside(context, spot.from);
      if (spot.to) inside(context, spot.to);
    }
  }
  walk({ rules: file.rules, phases: file.phases, end: file.end }, (node) => {
    if (node.kind === 'reaches') inside(context, node.place as Sum);
    if (node.kind !== 'range') return;
    inside(context, node.from as Sum);
    inside(context, node.to as Sum);
  });
  for (const draw of file.draws) {
    // A length that is drawn need not be a place: only one that something reaches is.
    if (!isPlace(context, draw.name.name)) continue;
    const { low, high } = intervalOfChoices(draw.choices, symbols);
    offBelt(context, draw.choices.at, low, high);
  }
  for (const { rows, file: name } of file.tables) {
    if (rows.kind !== 'places') continue;
    const row = rows.placeCm.findIndex((place) => place >= file.beltLengthCm.value);
    if (row < 0) continue;
    problems.report(
      'offBelt',
      name.at,
      `row ${row + 1} is at ${rows.placeCm[row]} cm, off the belt`,
      {
        expected: `below ${file.beltLengthCm.written}`,
      },
    );
  }
};

/**
 * An amount that may leave the belt. Sums wrap round it (`spot - 30 cm` over the seam), so only one
 * written out, or beyond a whole belt, is a mistake.
 */
function inside(context: CheckContext, sum: Sum): void {
  const { low, high } = intervalOf(sum, context.symbols);
  const length = context.file.beltLengthCm.value;
  if (namesIn(sum).length > 0) {
    if (low > -length && high < 2 * length) return;
  }
  // A bare name is told of where it is declared.
  if (sum.kind === 'name') return;
  offBelt(context, sum.at, low, high);
}

function offBelt(
  { file, problems }: CheckContext,
  at: SourceSpan,
  low: number,
  high: number,
): void {
  const { value, written } = file.beltLengthCm;
  if (!Number.isFinite(low) || !Number.isFinite(high)) return;
  if (low >= 0 && high <= value) return;
  const where = formatQuantity(low < 0 ? low : high, 'length');
  problems.report('offBelt', at, `${where} is off the belt`, { expected: `0 to ${written}` });
}

function isPlace({ file }: CheckContext, name: string): boolean {
  let found = false;
  walk({ rules: file.rules }, (node) => {
    const place = node.kind === 'reaches' ? (node.place as Sum) : undefined;
    if (place?.kind === 'name' && place.name === name) found = true;
  });
  return found || file.places.some(({ place }) => namesIn(place).some((ref) => ref.name === name));
}
