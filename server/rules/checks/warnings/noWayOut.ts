import type { Check } from '../check.js';
import { jumps } from '../course.js';
import { hasWayOut } from './phaseUnreached.js';

/** Phases, other than a last one `to the end`, that nothing leaves. */
export const noWayOut: Check = (context) => {
  const { file, problems } = context;
  const { named, next } = jumps(file);
  // A rule may leave any phase.
  if (named.size > 0 || next) return;
  file.phases.forEach((phase, index) => {
    const last = index === file.phases.length - 1;
    if (hasWayOut(context, phase) || (last && phase.course.kind === 'to the end')) return;
    problems.report('noWayOut', phase.at, `nothing ends \`${phase.name.name}\``, {
      expected: 'a length, a condition that can come true, or a rule that says `go to next phase`',
    });
  });
};
