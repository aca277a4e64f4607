import type { RuleDecl, SpanExpr, Spot } from '../../ast.js';
import { costOf } from '../../bounds/cost.js';
import { formatQuantity } from '../../units.js';
import type { Check, CheckContext } from '../check.js';
import { intervalOf, spotsOf } from '../interval.js';

/** A walking pace; a running mouse is faster (common practice, no source). */
const SLOW_CM_PER_S = 10;

/** A pulse begun in a span that is longer than the animal is likely to stay there. */
export const outlastsStay: Check = (context) => {
  for (const rule of context.file.rules) check(context, rule);
};

function check(context: CheckContext, rule: RuleDecl): void {
  const moment = rule.when.kind === 'after' ? rule.when.moment : rule.when;
  const span =
    moment.kind === 'enters' ? moment.span : 'within' in moment ? moment.within : undefined;
  if (!span) return;
  const length = Math.min(...spotsOfSpan(context, span).map((spot) => lengthOf(context, spot)));
  if (!Number.isFinite(length)) return;
  const stayUs = (length / SLOW_CM_PER_S) * 1e6;
  for (const action of rule.do) {
    const { body } = action;
    const until =
      body.kind === 'hold' ? body.until : body.kind === 'pulse' ? body.train?.until : undefined;
    const cost = until?.while ? undefined : costOf(action, context.symbols);
    if (!cost || body.kind === 'give' || !(cost.lastsUs > stayUs)) continue;
    context.problems.report(
      'outlastsStay',
      action.at,
      `this lasts ${formatQuantity(cost.lastsUs, 'time')}`,
      {
        expected: `at ${SLOW_CM_PER_S} cm/s the animal stays ${formatQuantity(stayUs, 'time')}; \`while in ...\` stops it as the animal leaves`,
        also: [{ at: span.at, note: 'the place' }],
      },
    );
  }
}

function spotsOfSpan(
  { symbols }: CheckContext,
  span: SpanExpr,
): readonly Pick<Spot, 'from' | 'to'>[] {
  return span.kind === 'name' ? spotsOf(span.name, symbols) : [span];
}

function lengthOf(
  { symbols, file }: CheckContext,
  { from, to }: Pick<Spot, 'from' | 'to'>,
): number {
  if (!to) return Infinity;
  const start = intervalOf(from, symbols);
  const end = intervalOf(to, symbols);
  if (start.low !== start.high || end.low !== end.high) return Infinity;
  const length = end.low - start.low;
  return length >= 0 ? length : length + file.beltLengthCm.value;
}
