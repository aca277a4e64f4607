import type { Check } from '../check.js';
import { endsByRule } from '../course.js';

/** A session that nothing ends. */
export const noEnd: Check = ({ file, problems }) => {
  const last = file.phases.at(-1);
  if (file.end || endsByRule(file)) return;
  if (last && last.course.kind !== 'to the end') return;
  const at = last?.at ?? { file: 0, start: 0, end: 1 };
  problems.report('noEnd', at, 'nothing ends the session but the operator', {
    expected: '`end:` with a condition such as `time >= 60 min`',
  });
};
