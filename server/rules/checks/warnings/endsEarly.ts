import type { Condition, Sum } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { alternativesOf } from '../course.js';
import { intervalOf } from '../interval.js';

/** `lap >= 20` where something ends: it ends as lap 20 begins, after 19 laps. */
export const endsEarly: Check = (context) => {
  const { file } = context;
  for (const { course } of file.phases) {
    if (course.kind === 'until') check(context, course.condition, 'phase');
  }
  if (file.end) check(context, file.end, 'session');
};

function check(
  { symbols, problems }: CheckContext,
  condition: Condition,
  stretch: 'phase' | 'session',
): void {
  for (const term of alternativesOf(condition)) {
    if (term.kind !== 'compare') continue;
    const grows = term.operator === '>=';
    if (!grows && term.operator !== '<=') continue;
    const [subject, bound]: [Sum, Sum] = grows ? [term.left, term.right] : [term.right, term.left];
    if (
      subject.kind !== 'measure' ||
      (subject.measure !== 'lap' && subject.measure !== 'phase lap')
    )
      continue;
    const { low } = intervalOf(bound, symbols);
    const whole = Number.isFinite(low) ? ` ${low}` : '';
    problems.report(
      'endsEarly',
      term.at,
      `this ends as lap${whole} begins, after ${low - 1} whole laps`,
      {
        expected: `\`laps done this ${stretch} >=${whole}\` for${whole} whole laps`,
      },
    );
  }
}
