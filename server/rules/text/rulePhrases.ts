/** The phrases of a rule: when, chance, do, limit, within. */
import type {
  Action,
  ActionBody,
  Asked,
  Cap,
  Moment,
  Quantity,
  SpanExpr,
  Sum,
  UntilThen,
  When,
} from '../ast.js';
import { amount, amountOrCount, count, needUnit, quantity, span, stretch, sum } from './amounts.js';
import { condition } from './conditions.js';
import type { Phrase } from './phrase.js';
import { ordinal } from './words.js';

// when = moment | amount "after" moment | "every" amount | "every row of" NAME
//      | condition [ "for" amount ] .
export function when(p: Phrase): When {
  const mark = p.mark();
  if (p.accept('every')) {
    if (p.accept('row of')) {
      return { kind: 'every row', table: p.name('a name of a table'), at: p.since(mark) };
    }
    return { kind: 'every', interval: amount(p), at: p.since(mark) };
  }
  if (p.isAt('after', 1) && p.peek().kind !== 'ordinal') {
    const delay = amount(p);
    p.expect('after');
    return { kind: 'after', delay, moment: expectMoment(p), at: p.since(mark) };
  }
  const found = moment(p);
  if (found) return found;
  const state = condition(p);
  const lasting = p.accept('for') ? amount(p) : undefined;
  return { kind: 'becomes', condition: state, ...(lasting ? { lasting } : {}), at: p.since(mark) };
}

function expectMoment(p: Phrase): Moment {
  const found = moment(p);
  if (found) return found;
  p.remember('a moment such as `water fires`');
  p.fail();
}

// moment = "reaches" sum | ( "enters" | "leaves" ) span
//        | ( "lap" | "cell" | "session" | NAME ) "begins" | NAME "fires" | NAME ( "rises" | "falls" )
//        | "lick" [ "in" span ] | ORDINAL "lick" [ "in" span ] "this" stretch
//        | count "licks within" amount [ "in" span ] | "operator presses" NAME .
export function moment(p: Phrase): Moment | undefined {
  const mark = p.mark();
  if (p.accept('reaches')) return { kind: 'reaches', place: sum(p), at: p.since(mark) };
  const crossing = p.oneOf(['enters', 'leaves']);
  if (crossing) return { kind: crossing, span: span(p), at: p.since(mark) };
  if (p.accept('operator presses')) {
    return { kind: 'presses', button: p.name('a name of a button'), at: p.since(mark) };
  }
  if (p.accept('lick')) return { kind: 'lick', ...placed(p), at: p.since(mark) };
  if (p.peek().kind === 'ordinal') return nthLick(p);
  return boutOrEvent(p);
}

function nthLick(p: Phrase): Moment {
  const mark = p.mark();
  const token = p.next();
  if (token.value < 1 || ordinal(token.value) !== token.text) {
    p.report('wrongForm', p.spanOf(token), `\`${token.text}\` is not a form of this language`, {
      expected: `\`${ordinal(Math.max(1, token.value))}\``,
    });
  }
  p.expect('lick');
  const where = placed(p);
  if (!p.at('this')) {
    p.report('scopeMissing', p.since(mark), 'over what stretch is it counted?', {
      expected: '`this visit`, `this lap`, `this phase`, `this cell` or `this session`',
    });
  }
  p.expect('this');
  return { kind: 'nth lick', nth: token.value, ...where, stretch: stretch(p), at: p.since(mark) };
}

/** Forms that begin with a name or a number: their second word tells which. */
function boutOrEvent(p: Phrase): Moment | undefined {
  const mark = p.mark();
  const { kind } = p.peek();
  if ((kind === 'number' || p.isName()) && p.isAt('licks', 1)) {
    const many = count(p);
    p.expect('licks within');
    const time = amount(p);
    return { kind: 'bout', count: many, time, ...placed(p), at: p.since(mark) };
  }
  for (const what of ['lap', 'cell', 'session'] as const) {
    if (p.isAt(what) && p.isAt('begins', 1)) {
      p.accept(`${what} begins`);
      return { kind: 'begins', what, at: p.since(mark) };
    }
  }
  if (!p.isName()) return undefined;
  for (const event of ['begins', 'fires', 'rises', 'falls'] as const) {
    if (!p.isAt(event, 1)) continue;
    const name = p.name('a name');
    p.expect(event);
    const at = p.since(mark);
    if (event === 'begins') return { kind: 'begins', what: name, at };
    if (event === 'fires') return { kind: 'fires', rule: name, at };
    return { kind: event, input: name, at };
  }
  return undefined;
}

function placed(p: Phrase): { within?: SpanExpr } {
  return p.accept('in') ? { within: span(p) } : {};
}

// chance = QUANTITY .
export function chance(p: Phrase): Quantity {
  const share = quantity(p);
  needUnit(p, share, 'a share such as `50 %`');
  return share;
}

// do = [ "after" amount "," ] action .
export function action(p: Phrase): Action {
  const mark = p.mark();
  if (!p.accept('after')) return { body: body(p), at: p.since(mark) };
  const delay = amount(p);
  p.expect(',');
  return { delay, body: body(p), at: p.since(mark) };
}

// action = "give" amount [ "from" NAME ]
//        | "pulse" NAME "for" amount [ "at" amount ( "," count "times" | until_then ) ]
//        | "hold" NAME until_then
//        | "stop" NAME | "note" | "go to" ( NAME | "next phase" ) | "end session" .
function body(p: Phrase): ActionBody {
  const mark = p.mark();
  if (p.accept('give')) {
    const volume = amount(p);
    const from = p.accept('from') ? p.name('a name of a valve') : undefined;
    return { kind: 'give', volume, ...(from ? { from } : {}), at: p.since(mark) };
  }
  if (p.accept('pulse')) return pulse(p, mark);
  if (p.accept('hold')) {
    const output = p.name('a name of an output');
    const until = untilThen(p);
    return { kind: 'hold', output, until, at: p.since(mark) };
  }
  if (p.accept('stop')) {
    return { kind: 'stop', output: p.name('a name of an output'), at: p.since(mark) };
  }
  if (p.accept('note')) return { kind: 'note', at: p.since(mark) };
  if (p.accept('go to')) {
    const phase = p.accept('next phase') ? 'next phase' : p.name('a name of a phase');
    return { kind: 'go to', phase, at: p.since(mark) };
  }
  p.expect('end session');
  return { kind: 'end session', at: p.since(mark) };
}

function pulse(p: Phrase, mark: number): ActionBody {
  const output = p.name('a name of an output');
  p.expect('for');
  const width = amount(p);
  if (!p.accept('at')) return { kind: 'pulse', output, width, at: p.since(mark) };
  const rate = amount(p);
  if (p.at(',') && !p.isAt('up', 1)) {
    p.expect(',');
    const times = count(p);
    p.expect('times');
    return { kind: 'pulse', output, width, train: { rate, times }, at: p.since(mark) };
  }
  const until = untilThen(p);
  return { kind: 'pulse', output, width, train: { rate, until }, at: p.since(mark) };
}

// until_then = [ "while" condition ] "," "up to" amount .
function untilThen(p: Phrase): UntilThen {
  const mark = p.mark();
  const holding = p.accept('while') ? condition(p) : undefined;
  p.expect(',');
  p.expect('up to');
  const upTo = amount(p);
  return { ...(holding ? { while: holding } : {}), upTo, at: p.since(mark) };
}

// limit = cap { "," cap } .
export function limit(p: Phrase): Cap[] {
  const caps = [cap(p)];
  while (p.accept(',')) caps.push(cap(p));
  return caps;
}

// cap = count "per" ( "lap" | "phase" | "cell" | "session" | amount )
//     | "at least" ( amount | count ( "lap" | "laps" ) ) "apart" .
function cap(p: Phrase): Cap {
  const mark = p.mark();
  if (p.accept('at least')) return apart(p, mark);
  const most = count(p);
  p.expect('per');
  const per: Sum | 'lap' | 'phase' | 'cell' | 'session' =
    p.oneOf(['lap', 'phase', 'cell', 'session']) ?? amount(p);
  return { kind: 'per', count: most, per, at: p.since(mark) };
}

function apart(p: Phrase, mark: number): Cap {
  const least = amountOrCount(p);
  if (p.accept('laps') || p.accept('lap')) {
    p.expect('apart');
    return { kind: 'apart laps', laps: least, at: p.since(mark) };
  }
  needUnit(p, least, 'a time such as `2 s`, or `laps`');
  p.expect('apart');
  return { kind: 'apart time', time: least, at: p.since(mark) };
}

// asked = "now" [ "or" next_laps ] | next_laps .
// next_laps = "in the next" ( "lap" | count "laps" ) .
export function asked(p: Phrase): Asked {
  const mark = p.mark();
  const now = p.accept('now');
  if (now && !p.accept('or')) return { now, at: p.since(mark) };
  p.expect('in the next');
  if (p.accept('lap')) return { now, laps: one(p), at: p.since(mark) };
  const laps = count(p);
  p.expect('laps');
  return { now, laps, at: p.since(mark) };
}

/** `the next lap` says one without a number. */
function one(p: Phrase): Quantity {
  const at = p.since(p.mark() - 1);
  return { kind: 'quantity', value: 1, dimension: 'number', written: '1', at };
}

// within = amount .
export function within(p: Phrase): Sum {
  return amount(p);
}
