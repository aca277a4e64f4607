import type { Condition, Sum } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { intervalOf } from '../interval.js';

/** An `until` or `end` that is true as the phase or session starts. */
export const trueAtStart: Check = (context) => {
  const { file, problems } = context;
  file.phases.forEach(({ course, name }, index) => {
    if (course.kind !== 'until') return;
    if (atStart(context, course.condition, index === 0) !== true) return;
    problems.report('trueAtStart', course.condition.at, `\`${name.name}\` ends as it starts`, {
      expected: 'a condition that is not true yet; what never happened is longer ago than any time',
    });
  });
  if (file.end && atStart(context, file.end, true) === true) {
    problems.report('trueAtStart', file.end.at, 'the session ends as it starts', {
      expected: 'a condition that is not true yet; what never happened is longer ago than any time',
    });
  }
};

/** The condition in the first instant; undefined when that cannot be told. */
function atStart(
  context: CheckContext,
  condition: Condition,
  ofSession: boolean,
): boolean | undefined {
  switch (condition.kind) {
    case 'and':
    case 'or': {
      const decides = condition.kind === 'or';
      const terms = condition.terms.map((term) => atStart(context, term, ofSession));
      if (terms.includes(decides)) return decides;
      return terms.includes(undefined) ? undefined : !decides;
    }
    case 'not': {
      const of = atStart(context, condition.of, ofSession);
      return of === undefined ? undefined : !of;
    }
    case 'still':
      return ofSession ? true : undefined;
    case 'compare': {
      const left = amountAtStart(context, condition.left, ofSession);
      const right = amountAtStart(context, condition.right, ofSession);
      if (left === undefined || right === undefined) return undefined;
      if (condition.operator === '<') return left < right;
      if (condition.operator === '<=') return left <= right;
      return condition.operator === '>' ? left > right : left >= right;
    }
    default:
      return undefined;
  }
}

function amountAtStart(context: CheckContext, sum: Sum, ofSession: boolean): number | undefined {
  if (sum.kind === 'since') return ofSession ? Infinity : undefined;
  if (sum.kind === 'measure') {
    if (sum.measure === 'phase time' || sum.measure === 'phase lap') return 0;
    if (sum.measure === 'position' || !ofSession) return undefined;
    return 0;
  }
  if (sum.kind === 'firings' || sum.kind === 'scoped') {
    if (sum.kind === 'scoped' && (sum.measure === 'share of licks' || sum.measure === 'mean speed'))
      return undefined;
    if (sum.scope.kind !== 'this') return undefined;
    return ofSession || sum.scope.stretch === 'phase' ? 0 : undefined;
  }
  const { low, high } = intervalOf(sum, context.symbols);
  return low === high ? low : undefined;
}
