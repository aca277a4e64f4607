import type { Condition, NameRef, Option } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { walk } from '../walk.js';

type Is = Condition & { readonly kind: 'is' };
const LEVELS = ['high', 'low'];

/** Words after `is` that the draw, the choice or the input never takes, and unknown phases. */
export const words: Check = (context) => {
  walk({ ...context.file, draws: [], operator: [] }, (node) => {
    if (node.kind === 'is') checkIs(context, node as unknown as Is);
  });
  for (const { choices, first } of context.file.operator) {
    if (choices.kind !== 'options' || first.kind !== 'name') continue;
    const known = choices.options.flatMap((option) =>
      option.kind === 'name' ? [option.name] : [],
    );
    if (!known.includes(first.name)) unknownWord(context, first, known);
  }
};

function checkIs(context: CheckContext, { subject, options }: Is): void {
  const { symbols, problems } = context;
  if (subject.kind === 'phase word') {
    for (const option of options) checkPhase(context, option);
    return;
  }
  if (subject.kind === 'name') {
    const symbol = symbols.get(subject.name);
    if (!symbol) {
      // An input, whose name has been checked.
      for (const option of options)
        if (!isOneOf(option, LEVELS)) unknownWord(context, option, LEVELS);
      return;
    }
    if (symbol.kind === 'draw' || symbol.kind === 'choice') {
      const { choices } = symbol.decl;
      if (choices.kind === 'options') {
        const known = choices.options.flatMap((option) =>
          option.kind === 'name' ? [option.name] : [],
        );
        for (const option of options) {
          if (
            option.kind === 'name' &&
            !known.includes(option.name) &&
            symbols.get(option.name)?.kind !== 'value'
          ) {
            unknownWord(context, option, known);
          }
        }
        return;
      }
    }
  }
  for (const option of options) {
    if (option.kind !== 'name') continue;
    const kind = symbols.get(option.name)?.kind;
    if (
      kind === 'broken' ||
      kind === 'value' ||
      kind === 'place' ||
      kind === 'draw' ||
      kind === 'choice'
    )
      continue;
    problems.unknown(
      kind === undefined ? 'unknownName' : 'wrongKind',
      option.at,
      kind === undefined
        ? `nothing is called \`${option.name}\``
        : `\`${option.name}\` is no amount`,
      option.name,
      symbols.namesOf('value', 'place'),
      'an amount',
    );
  }
}

function checkPhase({ symbols, problems }: CheckContext, option: Option): void {
  if (option.kind === 'quantity') {
    problems.report('wrongKind', option.at, '`phase` is a name, not a number', {
      expected: 'a name of a phase; its laps are counted by `phase lap`',
    });
    return;
  }
  const kind = symbols.get(option.name)?.kind;
  if (kind === 'phase' || kind === 'broken') return;
  problems.unknown(
    kind === undefined ? 'unknownName' : 'wrongKind',
    option.at,
    `no phase is called \`${option.name}\``,
    option.name,
    symbols.namesOf('phase'),
    'a name of a phase',
  );
}

function isOneOf(option: Option, known: readonly string[]): boolean {
  return option.kind === 'name' && known.includes(option.name);
}

function unknownWord(
  { problems }: CheckContext,
  option: Option | NameRef,
  known: readonly string[],
): void {
  const found = 'name' in option ? option.name : option.written;
  problems.unknown(
    'unknownWord',
    option.at,
    `it is never \`${found}\``,
    found,
    known,
    known.length === 0 ? 'an amount' : `one of ${known.join(', ')}`,
  );
}
