import type { Check } from '../check.js';
import { measuresIn } from '../walk.js';

/** Measures where only constants, draws and choices may stand. */
export const constants: Check = ({ file, problems }) => {
  const sections = [
    ['values', file.values.map(({ value }) => value)],
    ['places', file.places.map(({ place }) => place)],
    ['operator', file.operator.map(({ choices, step }) => ({ choices, step }))],
    ['draws', file.draws.map(({ choices, habits }) => ({ choices, habits }))],
  ] as const;
  for (const [section, pieces] of sections) {
    for (const { at } of measuresIn(pieces)) {
      problems.report(
        'measureInConstant',
        at,
        `a measure changes by itself and cannot stand in \`${section}\``,
        {
          expected: 'amounts and names; ask for measures in `if`, `until` or `end`',
        },
      );
    }
  }
};
