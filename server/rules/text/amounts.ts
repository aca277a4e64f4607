/** Amounts: what stands on either side of a comparison, and all that has a unit. */
import type {
  Choices,
  Mark,
  Measure,
  Option,
  Quantity,
  Scope,
  SourceSpan,
  SpanExpr,
  Spot,
  Stretch,
  Sum,
} from '../ast.js';
import { scale, UNITS } from '../units.js';
import { LONGEST_NUMBER } from './caps.js';
import type { Token } from './lexer.js';
import type { Phrase } from './phrase.js';

const STRETCHES = ['visit', 'lap', 'phase', 'cell', 'session'] as const;
const PREDICTED = ['width', 'centre', 'shift', 'asymmetry'] as const;
const AN_AMOUNT = 'an amount such as `4 uL` or `2 s`';
const A_NAME = 'a name';

// sum = [ "-" ] product { ( "+" | "-" ) product } .
export function sum(p: Phrase): Sum {
  const mark = p.mark();
  let left: Sum;
  if (p.isAt('-')) {
    p.next();
    const of = product(p);
    left = { kind: 'negate', of, at: p.since(mark) };
  } else {
    left = product(p);
  }
  for (;;) {
    const sign = p.peek();
    const operator = p.oneOf(['+', '-']);
    if (!operator) return left;
    if (operator === '-') spaced(p, sign, left.at);
    left = { kind: 'binary', operator, left, right: product(p), at: p.since(mark) };
  }
}

/** `a-b` could be a name or a range to a reader: a minus has a space on each side. */
function spaced(p: Phrase, sign: Token, left: SourceSpan): void {
  const after = p.peek();
  if (left.end < sign.start && sign.end < after.start) return;
  p.report('wrongForm', { ...left, end: after.end }, 'a minus needs a space on each side', {
    expected: 'a space on each side of `-`, or `to` for a range',
  });
}

// product = factor { ( "*" | "/" ) factor } .
export function product(p: Phrase): Sum {
  const mark = p.mark();
  let left = factor(p);
  for (;;) {
    const operator = p.oneOf(['*', '/']);
    if (!operator) return left;
    left = { kind: 'binary', operator, left, right: factor(p), at: p.since(mark) };
  }
}

// factor = QUANTITY | NUMBER | NAME | measure | ( "start" | "end" ) "of" NAME | "(" sum ")" .
export function factor(p: Phrase): Sum {
  const mark = p.mark();
  const { kind } = p.peek();
  if (kind === 'quantity' || kind === 'number') return quantity(p);
  if (p.isAt('(')) {
    p.next();
    const inner = p.nested(() => sum(p));
    p.expect(')');
    return inner;
  }
  for (const edge of ['start', 'end'] as const) {
    if (p.isAt(edge) && p.isAt('of', 1)) {
      p.accept(`${edge} of`);
      return { kind: 'edge', edge, of: p.name(A_NAME), at: p.since(mark) };
    }
  }
  const measured = measure(p);
  if (measured) return measured;
  p.remember('an amount');
  p.remember('a measure such as `speed` or `licks this lap`');
  const { name, at } = p.name(A_NAME);
  return { kind: 'name', name, at };
}

/** QUANTITY | NUMBER */
export function quantity(p: Phrase): Quantity {
  if (p.peek().kind !== 'quantity' && p.peek().kind !== 'number') {
    p.remember(AN_AMOUNT);
    p.fail();
  }
  return quantityOf(p, p.next());
}

function quantityOf(p: Phrase, token: Token, unit = token.unit): Quantity {
  const digits = /^[\d.]+/.exec(token.text)![0];
  const { dimension, size } = UNITS[unit] ?? { dimension: 'number', size: 1 };
  const value = scale(token.value, size);
  const at = p.spanOf(token);
  if (digits.length > LONGEST_NUMBER || value > Number.MAX_SAFE_INTEGER) {
    p.report('tooLarge', at, `\`${digits.slice(0, 20)}\` is larger or finer than can be reckoned`);
  }
  const written = unit === '' ? digits : unit === '%' ? `${digits} %` : `${digits} ${unit}`;
  return { kind: 'quantity', value, dimension, written, at };
}

// measure = "position" | "speed" | "lap" | ... .
function measure(p: Phrase): Measure | undefined {
  const mark = p.mark();
  for (const simple of ['phase lap', 'phase time', 'lap time', 'position', 'speed'] as const) {
    if (p.take(simple)) return { kind: 'measure', measure: simple, at: p.since(mark) };
  }
  if ((p.isAt('time') || p.isAt('laps')) && p.isAt('since', 1)) {
    const unit = p.next().text as 'time' | 'laps';
    p.expect('since');
    return { kind: 'since', unit, mark: markOf(p), at: p.since(mark) };
  }
  for (const simple of ['lap', 'time'] as const) {
    if (p.take(simple)) return { kind: 'measure', measure: simple, at: p.since(mark) };
  }
  if (p.take('licks')) return scoped(p, mark, 'licks', placed(p));
  if (p.take('share of licks')) {
    p.expect('in');
    return scoped(p, mark, 'share of licks', span(p));
  }
  if (p.take('mean speed')) return scoped(p, mark, 'mean speed', placed(p));
  if (p.isAt('water') && p.isAt('given', 1)) {
    p.accept('water given');
    return scoped(p, mark, 'water given');
  }
  if (p.take('laps done')) return scoped(p, mark, 'laps done');
  if (p.take('predicted')) {
    const what = p.oneOf(PREDICTED) ?? p.fail();
    p.expect('of');
    return { kind: 'predicted', what, of: p.name('a name of a rule'), at: p.since(mark) };
  }
  return firings(p);
}

// [ "real" | "sham" ] "firings of" NAME scope
function firings(p: Phrase): Measure | undefined {
  const mark = p.mark();
  const qualified = (p.isAt('real') || p.isAt('sham')) && p.isAt('firings', 1);
  if (!qualified && !p.isAt('firings')) return undefined;
  const which = qualified ? (p.next().text as 'real' | 'sham') : 'all';
  p.expect('firings of');
  const of = p.name('a name of a rule');
  const over = scope(p);
  return { kind: 'firings', of, which, scope: over, at: p.since(mark) };
}

function placed(p: Phrase): SpanExpr | undefined {
  return p.accept('in') ? span(p) : undefined;
}

function scoped(
  p: Phrase,
  mark: number,
  name: Extract<Measure, { kind: 'scoped' }>['measure'],
  within?: SpanExpr,
): Measure {
  const over = scope(p);
  const at = p.since(mark);
  return { kind: 'scoped', measure: name, ...(within ? { within } : {}), scope: over, at };
}

// mark = NAME ( "fires" | "rises" | "falls" | "begins" ) | "lick" [ "in" NAME ]
//      | ( "reaches" | "enters" | "leaves" ) NAME .
function markOf(p: Phrase): Mark {
  const mark = p.mark();
  if (p.accept('lick')) {
    const within = p.accept('in') ? p.name('a name of a place') : undefined;
    return { kind: 'lick mark', ...(within ? { within } : {}), at: p.since(mark) };
  }
  const crossing = p.oneOf(['reaches', 'enters', 'leaves']);
  if (crossing) {
    const place = p.name('a name of a place');
    return { kind: 'place mark', event: crossing, place, at: p.since(mark) };
  }
  const name = p.name('a name of a rule, input or phase');
  const event = p.oneOf(['fires', 'rises', 'falls', 'begins']) ?? p.fail();
  return { kind: 'name mark', name, event, at: p.since(mark) };
}

// scope = "this" stretch | "over the last" ( "lap" | count ( "lap" | "laps" ) | amount ) .
export function scope(p: Phrase): Scope {
  const mark = p.mark();
  if (p.accept('this')) return { kind: 'this', stretch: stretch(p), at: p.since(mark) };
  if (!p.at('over')) {
    const { start } = p.spanOf(p.peek());
    const before = p.since(Math.max(0, mark - 1));
    p.report(
      'scopeMissing',
      { ...before, end: Math.max(before.end, start) },
      'over what stretch?',
      {
        expected:
          '`this lap`, `this phase`, `this session`, `over the last 10 laps`, `over the last 2 s`, ...',
      },
    );
  }
  p.expect('over the last');
  const one = p.mark();
  if (p.accept('lap')) {
    const at = p.since(one);
    const count: Quantity = { kind: 'quantity', value: 1, dimension: 'number', written: '1', at };
    return { kind: 'last laps', count, at: p.since(mark) };
  }
  const many = amountOrCount(p);
  if (p.accept('laps') || p.accept('lap'))
    return { kind: 'last laps', count: many, at: p.since(mark) };
  needUnit(p, many, 'a time such as `2 s`, or `laps`');
  return { kind: 'last time', time: many, at: p.since(mark) };
}

// stretch = "visit" | "lap" | "phase" | "cell" | "session" .
export function stretch(p: Phrase): Stretch {
  return p.oneOf(STRETCHES) ?? p.fail();
}

// span = NAME | sum "to" sum .
export function span(p: Phrase): SpanExpr {
  const mark = p.mark();
  const from = sum(p);
  if (p.accept('to')) {
    const { low, high } = range(p, from, sum(p));
    return { kind: 'range', from: low, to: high, at: p.since(mark) };
  }
  if (from.kind === 'name') return from;
  p.report('unexpectedWord', from.at, 'a span has two edges', {
    expected: 'a name of a span, or `85 to 95 cm`',
  });
}

// spot = sum [ "to" sum ] .
export function spot(p: Phrase): Spot {
  const mark = p.mark();
  const from = sum(p);
  if (!p.accept('to')) return { from, at: p.since(mark) };
  const { low, high } = range(p, from, sum(p));
  return { from: low, to: high, at: p.since(mark) };
}

/** The unit may be written once at the end of a range: `85 to 95 cm`. */
export function range(p: Phrase, from: Sum, to: Sum): { low: Sum; high: Sum } {
  const unit = to.kind === 'quantity' ? unitOf(to) : '';
  return { low: unit === '' ? from : withUnit(p, from, unit), high: to };
}

function withUnit(p: Phrase, amount: Sum, unit: string): Sum {
  if (amount.kind === 'negate') return { ...amount, of: withUnit(p, amount.of, unit) };
  if (amount.kind !== 'quantity' || unitOf(amount) !== '') return amount;
  return quantityOf(p, p.tokens.find((token) => token.start === amount.at.start)!, unit);
}

/** A quantity's unit as written; empty for a bare number. */
export function unitOf(quantity: Quantity): string {
  return quantity.written.replace(/^[\d.]+ ?/, '');
}

// amount = QUANTITY | NAME .
export function amount(p: Phrase): Sum {
  const found = amountOrCount(p);
  needUnit(p, found, AN_AMOUNT);
  return found;
}

/** `amount | NUMBER`, where what follows tells which is meant. */
export function amountOrCount(p: Phrase): Sum {
  const { kind } = p.peek();
  if (kind === 'quantity' || kind === 'number') return quantity(p);
  p.remember(AN_AMOUNT);
  const { name, at } = p.name(A_NAME);
  return { kind: 'name', name, at };
}

/** A bare number where an amount belongs. */
export function needUnit(p: Phrase, found: Sum, expected: string): void {
  if (found.kind !== 'quantity' || unitOf(found) !== '') return;
  const next = p.peek();
  // `5 sec`: the word after it was meant as its unit.
  if (next.kind === 'word' && next.start - found.at.end <= 1) {
    p.remember(expected);
    if (!p.isName()) missingUnit(p, found, expected);
    p.fail();
  }
  missingUnit(p, found, expected);
}

function missingUnit(p: Phrase, found: Quantity, expected: string): never {
  p.report('unitMissing', found.at, `\`${found.written}\` has no unit`, { expected });
}

// count = NUMBER | NAME .
export function count(p: Phrase): Sum {
  if (p.isKind('number', 'a number')) return quantity(p);
  if (p.peek().kind === 'quantity') {
    p.report('unexpectedWord', p.spanOf(p.peek()), `\`${p.peek().text}\` has a unit`, {
      expected: 'a plain number',
    });
  }
  const { name, at } = p.name(A_NAME);
  return { kind: 'name', name, at };
}

/** NUMBER, as a value. */
export function number(p: Phrase): number {
  if (!p.isKind('number', 'a number')) p.fail();
  return quantity(p).value;
}

// option = QUANTITY | NUMBER | NAME .
export function option(p: Phrase): Option {
  const { kind } = p.peek();
  if (kind === 'quantity' || kind === 'number') return quantity(p);
  p.remember('an amount');
  const { name, at } = p.name('a word');
  return { kind: 'name', name, at };
}

/** Gives the unit of the last option to those before it: `20 or 60 or 140 cm`. */
export function sharedUnit(p: Phrase, options: readonly Option[]): Option[] {
  const last = options.at(-1)!;
  const unit = last.kind === 'quantity' ? unitOf(last) : '';
  if (unit === '') return [...options];
  return options.map((item) => withUnit(p, item, unit) as Option);
}

// choices = option { "or" option } | sum "to" sum .
export function choices(p: Phrase): Choices {
  const mark = p.mark();
  const first = sum(p);
  if (p.accept('to')) {
    const { low, high } = range(p, first, sum(p));
    return { kind: 'between', from: low, to: high, at: p.since(mark) };
  }
  if (first.kind !== 'quantity' && first.kind !== 'name') {
    p.report('unexpectedWord', first.at, 'a choice is one amount or one word', {
      expected: '`20 or 60 cm`, `stim or sham`, or a range `20 to 160 cm`',
    });
  }
  const options: Option[] = [first];
  while (p.accept('or')) options.push(option(p));
  return { kind: 'options', options: sharedUnit(p, options), at: p.since(mark) };
}
