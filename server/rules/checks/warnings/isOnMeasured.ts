import type { Check } from '../check.js';
import { measuresIn, type Node, walk } from '../walk.js';

/** Measures that go through their values smoothly, so that one exact value is hardly ever met. */
const SMOOTH = new Set([
  'position',
  'speed',
  'time',
  'phase time',
  'lap time',
  'mean speed',
  'share of licks',
  'water given',
]);

/** `is` on a measured amount. */
export const isOnMeasured: Check = ({ file, problems }) => {
  walk(file, (node) => {
    if (node.kind !== 'is') return;
    const subject = node.subject as Node;
    const smooth = measuresIn(subject).find(
      (measure) =>
        SMOOTH.has(measure.measure as string) ||
        measure.kind === 'predicted' ||
        (measure.kind === 'since' && measure.unit === 'time'),
    );
    if (!smooth || !node.at) return;
    problems.report('isOnMeasured', node.at, 'a measured amount is hardly ever exactly this', {
      expected: 'a range, `is 20 to 40 cm`, or `>=`',
    });
  });
};
