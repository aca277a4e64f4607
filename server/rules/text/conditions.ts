/** Conditions: what `if`, `until`, `while`, `sham`, `end` and some `when` ask. */
import type { Condition, Option, Sum } from '../ast.js';
import { count, option, range, sharedUnit, span, sum } from './amounts.js';
import type { Phrase } from './phrase.js';

const COMPARISONS = ['<', '<=', '>', '>='] as const;

// condition = test | test "and" test { "and" test } | test "or" test { "or" test } .
export function condition(p: Phrase): Condition {
  const mark = p.mark();
  const first = test(p);
  const word = p.oneOf(['and', 'or']);
  if (!word) return first;
  const terms = [first];
  do {
    terms.push(test(p));
  } while (p.accept(word));
  const other = word === 'and' ? 'or' : 'and';
  if (p.isAt(other)) {
    p.report(
      'andOrMixed',
      p.spanOf(p.peek()),
      `\`${other}\` beside \`${word}\` can be read in two ways`,
      {
        expected: 'parentheses: `(a and b) or c`, or `a and (b or c)`',
      },
    );
  }
  return { kind: word, terms, at: p.since(mark) };
}

// test = [ "not" ] ( "(" condition ")" | "in" span | "still" | "learned in" span | comparison ) .
export function test(p: Phrase): Condition {
  const mark = p.mark();
  if (p.take('not')) {
    const of = bare(p);
    return { kind: 'not', of, at: p.since(mark) };
  }
  return bare(p);
}

function bare(p: Phrase): Condition {
  const mark = p.mark();
  if (p.isAt('(') && !parenthesesHoldAmount(p)) {
    p.next();
    const inner = p.nested(() => condition(p));
    p.expect(')');
    return inner;
  }
  if (p.accept('in')) {
    const within = span(p);
    return { kind: 'in', span: within, at: p.since(mark) };
  }
  if (p.accept('still')) return { kind: 'still', at: p.since(mark) };
  if (p.accept('learned in')) {
    const within = span(p);
    return { kind: 'learned', span: within, at: p.since(mark) };
  }
  return comparison(p);
}

/** `(a + b) > c` or `(a > b) and c`: what follows the closing parenthesis tells which. */
function parenthesesHoldAmount(p: Phrase): boolean {
  let open = 0;
  for (let ahead = 0; p.peek(ahead).kind !== 'end'; ahead++) {
    if (p.isAt('(', ahead)) open++;
    if (!p.isAt(')', ahead)) continue;
    open--;
    if (open > 0) continue;
    const after = p.peek(ahead + 1).text;
    return ['+', '-', '*', '/', 'is', 'to', ...COMPARISONS].includes(after);
  }
  return false;
}

// comparison = sum ( "<" | "<=" | ">" | ">=" ) sum
//            | subject "is" option { "or" option } | subject "is not" option
//            | sum ( "is" | "is not" ) sum "to" sum
//            | sum ( "is" | "is not" ) "a multiple of" count .
export function comparison(p: Phrase): Condition {
  const mark = p.mark();
  const left = subject(p);
  if (left.kind !== 'phase word') {
    const operator = p.oneOf(COMPARISONS);
    if (operator) {
      const right = sum(p);
      return { kind: 'compare', operator, left, right, at: p.since(mark) };
    }
  }
  p.expect('is');
  const negated = p.take('not');
  if (left.kind === 'phase word') return isOneOf(p, mark, left, negated, option(p));
  if (p.accept('a multiple of')) {
    const of = count(p);
    return { kind: 'multiple', subject: left, negated, of, at: p.since(mark) };
  }
  const first = sum(p);
  if (p.accept('to')) {
    const { low, high } = range(p, first, sum(p));
    return { kind: 'is range', subject: left, negated, from: low, to: high, at: p.since(mark) };
  }
  if (first.kind !== 'quantity' && first.kind !== 'name') {
    p.report('unexpectedWord', first.at, '`is` takes a plain amount or a word', {
      expected: '`<`, `<=`, `>` or `>=` between reckoned amounts, or a range `is A to B`',
    });
  }
  return isOneOf(p, mark, left, negated, first);
}

// subject = sum | "phase" .
function subject(p: Phrase): Sum | Extract<Condition, { kind: 'is' }>['subject'] {
  if (p.isAt('phase') && !p.isAt('lap', 1) && !p.isAt('time', 1)) {
    const at = p.spanOf(p.next());
    return { kind: 'phase word', at };
  }
  return sum(p);
}

function isOneOf(
  p: Phrase,
  mark: number,
  subject: Extract<Condition, { kind: 'is' }>['subject'],
  negated: boolean,
  first: Option,
): Condition {
  const options = [first];
  while (p.isAt('or') && optionFollows(p)) {
    if (negated) {
      p.report('isNotOr', p.spanOf(p.peek()), '`is not` with `or` can be read in two ways', {
        expected: '`not (x is a or b)`, or `x is not a and x is not b`',
      });
    }
    p.next();
    options.push(option(p));
  }
  p.remember('`or`');
  return { kind: 'is', subject, negated, options: sharedUnit(p, options), at: p.since(mark) };
}

/** After `is a or`: is the next word another choice, or does another test begin? */
function optionFollows(p: Phrase): boolean {
  const { kind } = p.peek(1);
  if (kind !== 'quantity' && kind !== 'number' && !p.isName(1)) return false;
  const after = p.peek(2);
  return after.kind === 'end' || ['or', 'and', ')', ',', 'for'].includes(after.text);
}
