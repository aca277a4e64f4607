/** Random phrases, made from the grammar: every alternative of every rule comes up. */
import fc from 'fast-check';

type Text = fc.Arbitrary<string>;
/** The parts one after another; texts stand for themselves. */
const seq = (...parts: (Text | string)[]): Text =>
  fc
    .tuple(...parts.map((part) => (typeof part === 'string' ? fc.constant(part) : part)))
    .map((all) => all.filter((text) => text !== '').join(' '));
const any = (...parts: (Text | string)[]): Text =>
  fc.oneof(...parts.map((part) => (typeof part === 'string' ? fc.constant(part) : part)));
const maybe = (part: Text): Text => any('', part);
const list = (part: Text, separator: string, min = 1): Text =>
  fc.array(part, { minLength: min, maxLength: 3 }).map((all) => all.join(separator));
const close = (text: Text): Text => text.map((t) => t.replaceAll(' ,', ','));

const NAME = any(
  'zone',
  'target',
  'kind',
  'water',
  'probe',
  'first',
  'start',
  'real',
  'drop_2',
  'constructor',
);
const NUMBER = any('0', '1', '4', '0.5', '12.25', '300');
const QUANTITY = fc
  .tuple(NUMBER, any('cm', 'mm', 's', 'ms', 'min', 'uL', 'cm/s', 'Hz', '%'), any('', ' '))
  .map(([n, u, gap]) => n + gap + u);
const ORDINAL = any('1st', '2nd', '3rd', '11th', '22nd');
const amount = any(QUANTITY, NAME);
const count = any(NUMBER, NAME);
const stretch = any('visit', 'lap', 'phase', 'cell', 'session');
const scope = any(
  seq('this', stretch),
  'over the last lap',
  seq('over the last', count, 'laps'),
  seq('over the last', amount),
);
const mark = any(
  seq(NAME, any('fires', 'rises', 'falls', 'begins')),
  'lick',
  seq('lick in', NAME),
  seq(any('reaches', 'enters', 'leaves'), NAME),
);

const { sum, span } = fc.letrec<{
  sum: string;
  product: string;
  factor: string;
  span: string;
  measure: string;
}>((tie) => ({
  sum: seq(
    maybe(fc.constant('-')).map((sign) => sign),
    tie('product'),
    maybe(seq(any('+', '-'), tie('product'))),
  ).map((text) => text.replace(/^- /, '-')),
  product: seq(tie('factor'), maybe(seq(any('*', '/'), tie('factor')))),
  factor: fc.oneof(
    { maxDepth: 2, withCrossShrink: true },
    any(QUANTITY, NUMBER, NAME),
    tie('measure'),
    seq(any('start of', 'end of'), NAME),
    tie('sum').map((text) => `(${text})`),
  ),
  span: fc.oneof({ maxDepth: 2 }, NAME, seq(tie('sum'), 'to', tie('sum'))),
  measure: any(
    'position',
    'speed',
    'lap',
    'phase lap',
    'time',
    'phase time',
    'lap time',
    seq('licks', scope),
    seq('licks in', tie('span'), scope),
    seq('share of licks in', tie('span'), scope),
    seq('mean speed', scope),
    seq('mean speed in', tie('span'), scope),
    seq('water given', scope),
    seq('laps done', scope),
    seq(any('', 'real', 'sham'), 'firings of', NAME, scope),
    seq(any('time', 'laps'), 'since', mark),
  ),
}));
const option = any(QUANTITY, NUMBER, NAME);
const { condition } = fc.letrec<{ condition: string; test: string; bare: string }>((tie) => ({
  condition: fc.oneof(
    { maxDepth: 3 },
    tie('test'),
    list(tie('test'), ' and ', 2),
    list(tie('test'), ' or ', 2),
  ),
  test: seq(any('', 'not'), tie('bare')),
  bare: fc.oneof(
    { maxDepth: 3 },
    any(
      'still',
      seq('in', span),
      seq(sum, any('<', '<=', '>', '>='), sum),
      seq(any(sum, 'phase'), 'is', list(NAME, ' or ')),
      seq(sum, 'is', list(option, ' or ')),
      seq(any(sum, 'phase'), 'is not', NAME),
      seq(sum, any('is', 'is not'), sum, 'to', sum),
      seq(sum, any('is', 'is not'), 'a multiple of', count),
    ),
    tie('condition').map((text) => `(${text})`),
  ),
}));
const moment = any(
  seq('reaches', sum),
  seq(any('enters', 'leaves'), span),
  seq(any('lap', 'cell', 'session', NAME), 'begins'),
  seq(NAME, any('fires', 'rises', 'falls')),
  seq('lick', maybe(seq('in', span))),
  seq(ORDINAL, 'lick', maybe(seq('in', span)), 'this', stretch),
  seq(count, 'licks within', amount, maybe(seq('in', span))),
  seq('operator presses', NAME),
);
const untilThen = seq(maybe(seq('while', condition)), ', up to', amount);
const action = any(
  seq('give', amount, maybe(seq('from', NAME))),
  seq('pulse', NAME, 'for', amount),
  seq('pulse', NAME, 'for', amount, 'at', amount, any(seq(',', count, 'times'), untilThen)),
  seq('hold', NAME, untilThen),
  seq('stop', NAME),
  'note',
  seq('go to', any(NAME, 'next phase')),
  'end session',
);
const cap = any(
  seq(count, 'per', any('lap', 'phase', 'cell', 'session', amount)),
  seq('at least', amount, 'apart'),
  seq('at least', count, any('lap', 'laps'), 'apart'),
);
const spot = seq(sum, maybe(seq('to', sum)));
const butIn = (of: Text): Text => seq(of, maybe(seq(', but', of, 'in', list(NAME, ' or '))));
const choices = any(list(option, ' or '), seq(sum, 'to', sum));
const habit = any(
  seq('weighted', list(NUMBER, ' to ', 2)),
  seq('in shuffled blocks of', NUMBER),
  seq('at most', NUMBER, 'in a row'),
  seq('at least', any(amount, NUMBER), 'from the last'),
  seq('in steps of', any(amount, NUMBER)),
  seq('sealed'),
);
const length = any(seq(count, any('lap', 'laps')), amount);

/** A phrase of each key, of the grammar, whatever it may mean. */
export const PHRASES = {
  value: close(butIn(sum)),
  place: close(butIn(spot)),
  draw: close(
    seq(
      choices,
      ', every',
      any('lap', 'phase', 'cell', 'session', seq('visit to', NAME), seq('firing of', NAME)),
      maybe(seq(',', habit)),
      maybe(seq(',', habit)),
    ),
  ),
  operator: close(
    seq(choices, maybe(seq(', in steps of', any(amount, NUMBER))), ', at first', option),
  ),
  phase: close(
    seq(
      any(seq('for', list(length, ' or ')), seq('until', condition), 'to the end'),
      maybe(fc.constant(', at lap end')),
    ),
  ),
  when: close(
    any(
      moment,
      seq(amount, 'after', moment),
      seq('every', amount),
      seq('every row of', NAME),
      seq(condition, maybe(seq('for', amount))),
    ),
  ),
  if: condition,
  chance: QUANTITY,
  do: close(any(action, seq('after', amount, ',', action))),
  limit: list(cap, ', '),
  within: amount,
  asked: seq(
    any(
      'now',
      'in the next lap',
      seq('in the next', count, 'laps'),
      seq('now or in the next', count, 'laps'),
    ),
  ),
} as const;
