import { formatQuantity } from '../../units.js';
import type { Check } from '../check.js';
import { powersOf, samePowers } from '../dimensions.js';
import { intervalOf } from '../interval.js';
import { powersOfSum } from '../powers.js';

/** A board sends a frame a millisecond while something changes. */
const FRAME_US = 1_000;

/** A `within` tighter than one count of the encoder or one frame of the board. */
export const withinTooTight: Check = ({ file, rig, symbols, problems }) => {
  for (const { within } of file.rules) {
    const powers = within && powersOfSum(within, symbols);
    if (!within || !powers) continue;
    const { high } = intervalOf(within, symbols);
    const time = samePowers(powers, powersOf('time'));
    const least = time ? FRAME_US : rig ? 1 / rig.countsPerCm : 0;
    if (!(high < least)) continue;
    problems.report('withinTooTight', within.at, 'nothing can be this exact', {
      expected: time
        ? `${formatQuantity(least, 'time')} or more: one frame of the board`
        : `${formatQuantity(least, 'length')} or more: one count of the encoder`,
    });
  }
};
