import type { Check } from '../check.js';

/** Draws and operator's choices with one choice. */
export const oneChoice: Check = ({ file, problems }) => {
  for (const { choices } of [...file.draws, ...file.operator]) {
    if (choices.kind !== 'options' || choices.options.length > 1) continue;
    problems.report('oneChoice', choices.at, 'there is one choice only', {
      expected: '`a or b`, a range `20 to 160 cm`, or a name under `values`',
    });
  }
};
