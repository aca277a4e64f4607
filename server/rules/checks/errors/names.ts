import type { NameRef } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { KIND_WORDS, type RulesSymbol } from '../symbols.js';
import { type Role, usesOf } from '../uses.js';

/** Unknown names, and names of the wrong kind. */
export const names: Check = (context) => {
  for (const { ref, as } of usesOf(context.file)) checkUse(context, ref, as);
};

/** Measures of one word, for a name that is a misspelt one. */
const MEASURES = ['position', 'speed', 'lap', 'time'];

const NEEDED: Readonly<
  Record<Exclude<Role, 'input' | 'output' | 'valve' | 'button' | 'option'>, string>
> = {
  amount: 'an amount: a value, a point, a draw or a choice',
  point: 'a point',
  span: 'a span, which has two edges',
  rule: 'a rule',
  phase: 'a phase',
  table: 'a table',
  subject: 'an amount, a draw, a choice or an input',
};
const KINDS: Readonly<Record<keyof typeof NEEDED, readonly RulesSymbol['kind'][]>> = {
  amount: ['value', 'place', 'draw', 'choice'],
  point: ['value', 'place', 'draw', 'choice'],
  span: ['place', 'draw', 'choice'],
  rule: ['rule'],
  phase: ['phase'],
  table: ['table'],
  subject: ['value', 'place', 'draw', 'choice'],
};

function checkUse(context: CheckContext, ref: NameRef, role: Role): void {
  // The rig's names and the words after `is` have checks of their own.
  if (role === 'input' || role === 'output' || role === 'valve' || role === 'button') return;
  if (role === 'option') return;
  const { symbols, problems } = context;
  const symbol = symbols.get(ref.name);
  if (symbol?.kind === 'broken') return;
  if (!symbol) {
    if (role === 'subject' && isInput(context, ref)) return;
    const known = [
      ...symbols.namesOf(...KINDS[role]),
      ...(role === 'subject' ? inputsOf(context) : []),
    ];
    const words = role === 'amount' || role === 'subject' ? MEASURES : [];
    const expected =
      known.length === 0 ? NEEDED[role] : `${NEEDED[role]}; known: ${known.slice(0, 8).join(', ')}`;
    problems.unknown(
      'unknownName',
      ref.at,
      `nothing is called \`${ref.name}\``,
      ref.name,
      [...known, ...words],
      expected,
    );
    return;
  }
  const wrong = whyWrong(context, symbol, role, ref.name);
  if (wrong === undefined) return;
  const also = [{ at: symbol.decl.name.at, note: `\`${ref.name}\` is named here` }];
  problems.report('wrongKind', ref.at, `\`${ref.name}\` is ${shapeOf(context, symbol)}`, {
    expected: wrong,
    also,
  });
}

function isInput({ rig, symbols }: CheckContext, ref: NameRef): boolean {
  // Without a rig any name may be one of its inputs.
  return rig === undefined || symbols.hasInput(ref.name);
}

function inputsOf({ rig }: CheckContext): string[] {
  return rig?.inputs.map(({ name }) => name) ?? [];
}

type Declared = Exclude<RulesSymbol, { kind: 'broken' }>;

/** `a span`, `a draw of words`, `a rule`. */
function shapeOf({ symbols }: CheckContext, symbol: Declared): string {
  if (symbol.kind === 'place') return `a ${symbol.shape}`;
  if (symbol.kind !== 'draw' && symbol.kind !== 'choice') return KIND_WORDS[symbol.kind];
  const { kind } = symbols.yields(symbol.decl.choices);
  const of = {
    amount: ' of amounts',
    point: ' of points',
    span: ' of spans',
    word: ' of words',
    unclear: '',
  };
  return KIND_WORDS[symbol.kind] + of[kind];
}

/** What to say instead; undefined when the name is right. */
function whyWrong(
  { symbols }: CheckContext,
  symbol: Declared,
  role: keyof typeof NEEDED,
  name: string,
): string | undefined {
  if (!KINDS[role].includes(symbol.kind)) return hint(symbol, role, name);
  if (role === 'rule' || role === 'phase' || role === 'table') return undefined;
  const kind =
    symbol.kind === 'place'
      ? symbol.shape
      : symbol.kind === 'value'
        ? 'amount'
        : symbol.kind === 'draw' || symbol.kind === 'choice'
          ? symbols.yields(symbol.decl.choices).kind
          : 'unclear';
  if (kind === 'unclear') return undefined;
  if (role === 'subject') return undefined;
  if (role === 'span') {
    if (kind === 'span') return undefined;
    return kind === 'point'
      ? `a span: \`${name} - 2 cm to ${name} + 2 cm\`, or say \`reaches ${name}\``
      : NEEDED.span;
  }
  if (kind === 'span') {
    return role === 'point'
      ? `a point: say \`enters ${name}\`, or \`start of ${name}\``
      : `a point: say \`start of ${name}\`, \`end of ${name}\` or \`in ${name}\``;
  }
  return kind === 'word' ? `an amount; a word is asked for with \`${name} is ...\`` : undefined;
}

function hint(symbol: Declared, role: keyof typeof NEEDED, name: string): string {
  const amount = role === 'amount' || role === 'subject';
  if (symbol.kind === 'rule' && amount)
    return `a scope and a count: \`firings of ${name} this lap\``;
  if (symbol.kind === 'phase' && amount) return `\`phase is ${name}\``;
  return NEEDED[role];
}
