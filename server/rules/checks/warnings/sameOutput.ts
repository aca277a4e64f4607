import type { Moment, RuleDecl, When } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { contradictory, keyOf } from '../contradiction.js';
import { intervalOf } from '../interval.js';

/** Two rules on one output at one place or one lick: the second finds it busy. */
export const sameOutput: Check = (context) => {
  const { rules } = context.file;
  const moments = rules.map(({ when }) => momentKey(context, when));
  const outputs = rules.map((rule) => outputsOf(context, rule));
  for (let second = 1; second < rules.length; second++) {
    for (let first = 0; first < second; first++) {
      if (moments[first] === undefined || moments[first] !== moments[second]) continue;
      const shared = outputs[second]!.find((name) => outputs[first]!.includes(name));
      if (shared === undefined || context.problems.full) continue;
      report(context, rules[first]!, rules[second]!, shared);
    }
  }
};

function report(
  { symbols, problems }: CheckContext,
  first: RuleDecl,
  second: RuleDecl,
  output: string,
): void {
  const conditions = [first.if, second.if].flatMap((condition) => (condition ? [condition] : []));
  // `phase is a` and `phase is b` never meet.
  if (contradictory(conditions, symbols)) return;
  problems.report(
    'sameOutput',
    second.when.at,
    `\`${second.name.name}\` and \`${first.name.name}\` drive \`${output}\` at the same moment`,
    {
      expected: 'conditions that keep them apart: the second finds the output busy',
      also: [{ at: first.when.at, note: `\`${first.name.name}\`` }],
    },
  );
}

/** Equal keys: the same moment. A lick in a place and a lick anywhere are one lick. */
function momentKey({ symbols }: CheckContext, when: When): string | undefined {
  if (when.kind === 'reaches') {
    const { low, high } = intervalOf(when.place, symbols);
    return low === high ? `reaches ${low}` : `reaches ${keyOf(when.place)}`;
  }
  const often: readonly (Moment | When)['kind'][] = [
    'enters',
    'leaves',
    'nth lick',
    'begins',
    'rises',
    'falls',
    'presses',
    'fires',
    'bout',
  ];
  if (when.kind === 'lick') return 'lick';
  return often.includes(when.kind) ? keyOf(when) : undefined;
}

function outputsOf({ symbols }: CheckContext, rule: RuleDecl): string[] {
  return rule.do.flatMap(({ body, delay }) => {
    if (delay) return [];
    if (body.kind === 'give')
      return [symbols.valve(body.from)?.name ?? body.from?.name ?? 'the valve'];
    if (body.kind !== 'pulse' && body.kind !== 'hold') return [];
    return symbols.output(body.output.name)?.kind === 'mark' ? [] : [body.output.name];
  });
}
