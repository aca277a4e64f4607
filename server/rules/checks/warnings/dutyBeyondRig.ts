import type { RuleDecl } from '../../ast.js';
import { costOf } from '../../bounds/cost.js';
import { formatQuantity } from '../../units.js';
import type { Check, CheckContext } from '../check.js';
import { intervalOf } from '../interval.js';

/** More on-time in a window than the rig's duty allows: the guard will withhold. */
export const dutyBeyondRig: Check = (context) => {
  for (const rule of context.file.rules) check(context, rule);
};

function check(context: CheckContext, rule: RuleDecl): void {
  const { symbols, problems } = context;
  const every = leastBetweenUs(context, rule);
  for (const action of rule.do) {
    const cost = costOf(action, symbols);
    const duty = cost?.output?.duty;
    if (!cost || !duty) continue;
    const allowed = duty.share * duty.windowUs;
    const firings = every > 0 ? Math.max(1, Math.floor(duty.windowUs / every)) : 1;
    const one = Math.min(cost.onUs, duty.windowUs * cost.share);
    const on = Math.min(one * firings, duty.windowUs);
    if (!(on > allowed)) continue;
    const window = formatQuantity(duty.windowUs, 'time');
    problems.report(
      'dutyBeyondRig',
      action.at,
      `up to ${formatQuantity(on, 'time')} on in ${window}`,
      {
        expected: `${formatQuantity(allowed, 'time')} in ${window}: the rest is withheld`,
      },
    );
  }
}

/** How soon the rule may fire again where the file says so; 0 when it does not. */
function leastBetweenUs({ symbols }: CheckContext, rule: RuleDecl): number {
  const gaps = rule.limits.map((cap) =>
    cap.kind === 'apart time' ? intervalOf(cap.time, symbols).low : 0,
  );
  const interval = rule.when.kind === 'every' ? intervalOf(rule.when.interval, symbols).low : 0;
  const most = Math.max(interval, ...gaps);
  return Number.isFinite(most) ? most : 0;
}
