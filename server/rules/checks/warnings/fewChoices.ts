import type { Check } from '../check.js';
import { intervalOf, intervalOfChoices } from '../interval.js';

/** Less than this share of a range left is few. */
const LEAST_SHARE = 0.25;

/** A least distance that leaves few choices, so that the next one can be guessed. */
export const fewChoices: Check = ({ file, symbols, problems }) => {
  for (const { choices, habits } of file.draws) {
    const habit = habits.find(({ kind }) => kind === 'apart');
    if (habit?.kind !== 'apart') continue;
    const least = intervalOf(habit.least, symbols).high;
    const report = (what: string): void => {
      problems.report('fewChoices', habit.at, what, {
        expected: 'a smaller distance',
        also: [{ at: choices.at, note: 'the choices' }],
      });
    };
    if (choices.kind === 'between') {
      const { low, high } = intervalOfChoices(choices, symbols);
      const left = (high - low - 2 * least) / (high - low);
      if (left < LEAST_SHARE)
        report(`from the middle ${Math.max(0, Math.round(left * 100))} % of the range is left`);
      continue;
    }
    const points = choices.options.map((option) => intervalOf(option, symbols).low);
    const left = points.map((a) => points.filter((b) => Math.abs(a - b) >= least).length);
    if (Math.min(...left) < 2) report('from some choices only one other is left');
  }
};
