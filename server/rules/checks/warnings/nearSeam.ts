import type { SourceSpan, Sum } from '../../ast.js';
import { formatQuantity } from '../../units.js';
import type { Check, CheckContext } from '../check.js';
import { powersOf, samePowers } from '../dimensions.js';
import { type Interval, intervalOf, intervalOfChoices } from '../interval.js';
import { powersOfSum } from '../powers.js';
import { walk } from '../walk.js';

/** Places and edges nearer the seam than the slip allowed: a correction may jump over them. */
export const nearSeam: Check = (context) => {
  const { file, rig, symbols } = context;
  if (!rig?.seamMark) return;
  const look = (sum: Sum): void => {
    // A name is told of where it is declared.
    if (sum.kind !== 'name' && sum.kind !== 'edge')
      check(context, sum.at, intervalOf(sum, symbols));
  };
  for (const { place } of file.places) {
    for (const spot of [place.base, ...place.exceptions.map(({ value }) => value)]) {
      look(spot.from);
      if (spot.to) look(spot.to);
    }
  }
  walk({ rules: file.rules, phases: file.phases, end: file.end }, (node) => {
    if (node.kind === 'reaches') look(node.place as Sum);
    if (node.kind !== 'range') return;
    look(node.from as Sum);
    look(node.to as Sum);
  });
  const reached = new Set<string>();
  walk(file.rules, (node) => {
    const place = node.kind === 'reaches' ? (node.place as Sum) : undefined;
    if (place?.kind === 'name') reached.add(place.name);
  });
  for (const { name, choices } of [...file.draws, ...file.operator]) {
    const powers = choices.kind === 'between' ? powersOfSum(choices.from, symbols) : undefined;
    if (!reached.has(name.name) || !powers || !samePowers(powers, powersOf('length'))) continue;
    check(context, choices.at, intervalOfChoices(choices, symbols));
  }
};

function check(
  { file, rig, problems }: CheckContext,
  at: SourceSpan,
  { low, high }: Interval,
): void {
  if (!Number.isFinite(low) || !Number.isFinite(high) || !rig) return;
  const length = file.beltLengthCm.value;
  const slip = rig.slipAllowedCm;
  if (low >= slip && high <= length - slip) return;
  problems.report(
    'nearSeam',
    at,
    `${formatQuantity(low < slip ? low : high, 'length')} is near the seam`,
    {
      expected: `${formatQuantity(slip, 'length')} to ${formatQuantity(length - slip, 'length')}: the rig allows that much slip, and a correction may jump over it`,
    },
  );
}
