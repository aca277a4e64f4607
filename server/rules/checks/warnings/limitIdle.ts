import type { Cap, RuleDecl } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { intervalOf } from '../interval.js';

const STRETCHES = ['lap', 'phase', 'cell', 'session'];

/** Limits that can never matter: another one is reached first, or the rule is due once. */
export const limitIdle: Check = (context) => {
  for (const rule of context.file.rules) {
    for (const cap of rule.limits) check(context, rule, cap);
  }
};

function check(context: CheckContext, rule: RuleDecl, cap: Cap): void {
  const report = (other: { at: Cap['at'] }, note: string): void => {
    context.problems.report('limitIdle', cap.at, 'this limit is never reached', {
      expected: 'a smaller limit, or none',
      also: [{ at: other.at, note }],
    });
  };
  if (rule.when.kind === 'begins' && rule.when.what === 'session') {
    report(rule.when, 'this moment comes once');
    return;
  }
  const other = rule.limits.find(
    (candidate) => candidate !== cap && coveredBy(context, cap, candidate),
  );
  if (other) report(other, 'this one is reached first');
}

/** Does `other` keep `cap` from ever being reached? */
function coveredBy({ symbols, file }: CheckContext, cap: Cap, other: Cap): boolean {
  const limits = file.rules.find((rule) => rule.limits.includes(cap))!.limits;
  if (cap.kind !== 'per') {
    // Of two gaps the longer counts; of two equal ones the first.
    if (other.kind !== cap.kind) return false;
    const gap = (c: Cap): number =>
      c.kind === 'apart time'
        ? intervalOf(c.time, symbols).low
        : c.kind === 'apart laps'
          ? intervalOf(c.laps, symbols).low
          : 0;
    return (
      gap(cap) < gap(other) ||
      (gap(cap) === gap(other) && limits.indexOf(other) < limits.indexOf(cap))
    );
  }
  const count = intervalOf(cap.count, symbols).low;
  if (other.kind === 'apart time' && typeof cap.per !== 'string') {
    return (
      Math.floor(intervalOf(cap.per, symbols).high / intervalOf(other.time, symbols).low) + 1 <=
      count
    );
  }
  if (other.kind !== 'per') return false;
  const most = intervalOf(other.count, symbols).high;
  const longer =
    typeof cap.per === 'string' && typeof other.per === 'string'
      ? STRETCHES.indexOf(other.per) - STRETCHES.indexOf(cap.per)
      : typeof cap.per !== 'string' && typeof other.per !== 'string'
        ? Math.sign(intervalOf(other.per, symbols).low - intervalOf(cap.per, symbols).high)
        : -1;
  if (longer < 0) return false;
  if (longer === 0 && most === count) return limits.indexOf(other) < limits.indexOf(cap);
  // Where one cell, phase or lap may be the whole session, equal counts still differ.
  return longer === 0 ? most < count : most <= count;
}
