import type { Choices } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { intervalOf } from '../interval.js';

/** Choices of which only some are places, or of different units; ranges the wrong way round. */
export const drawChoices: Check = (context) => {
  for (const { choices } of context.file.draws) check(context, choices);
  for (const { choices } of context.file.operator) check(context, choices);
};

function check({ symbols, problems }: CheckContext, choices: Choices): void {
  if (choices.kind === 'between') {
    const from = intervalOf(choices.from, symbols);
    const to = intervalOf(choices.to, symbols);
    if (!(from.low >= to.high)) return;
    problems.report('drawImpossible', choices.at, 'the first bound is not below the second', {
      expected: 'the smaller bound first',
    });
    return;
  }
  const seen = new Map<string, (typeof choices.options)[number]>();
  for (const option of choices.options) {
    const key = option.kind === 'name' ? option.name : `${option.value} ${option.dimension}`;
    const first = seen.get(key);
    if (first) {
      problems.report('mixedChoices', option.at, 'this choice is there already', {
        expected: 'each choice once; `weighted 2 to 1` makes one come more often',
        also: [{ at: first.at, note: 'first here' }],
      });
    }
    seen.set(key, option);
  }
  if (symbols.yields(choices).kind !== 'unclear') return;
  if (choices.options.some((o) => o.kind === 'name' && symbols.get(o.name)?.kind === 'broken'))
    return;
  problems.report('mixedChoices', choices.at, 'these choices are not all of one kind', {
    expected: 'all words, all points, all spans, or all amounts of one unit',
  });
}
