import type { RuleDecl } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { usesIn } from '../uses.js';

/** Moments that can come any number of times in a lap. */
const OFTEN = new Set(['enters', 'leaves', 'rises', 'falls', 'lick', 'bout', 'presses', 'becomes']);

/** Rules with no limit on such a moment. */
export const noLimit: Check = (context) => {
  for (const rule of context.file.rules) {
    const moment = rule.when.kind === 'after' ? rule.when.moment : rule.when;
    if (!OFTEN.has(moment.kind) || rule.limits.length > 0 || !drives(context, rule)) continue;
    // `firings of itself this lap is 0` is a limit in other words.
    const counts = usesIn({ asked: rule.if }).some(({ ref }) => ref.name === rule.name.name);
    if (counts) continue;
    context.problems.report(
      'noLimit',
      rule.name.at,
      `nothing limits how often \`${rule.name.name}\` fires`,
      {
        expected: '`limit: 1 per lap`, `limit: at least 2 s apart`, ...',
        also: [{ at: rule.when.at, note: 'this can come any number of times' }],
      },
    );
  }
};

/** Does the rule drive anything but marks? */
function drives({ symbols }: CheckContext, rule: RuleDecl): boolean {
  return rule.do.some(({ body }) => {
    if (body.kind === 'give') return true;
    if (body.kind !== 'pulse' && body.kind !== 'hold') return false;
    return symbols.output(body.output.name)?.kind !== 'mark';
  });
}
