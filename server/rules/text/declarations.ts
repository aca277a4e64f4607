/** The phrases of every section but `rules`. */
import type {
  ByPhase,
  Choices,
  Habit,
  NameRef,
  Occasion,
  Option,
  PhaseDecl,
  PhaseLength,
  Quantity,
  Spot,
  Sum,
} from '../ast.js';
import {
  amountOrCount,
  choices,
  needUnit,
  number,
  option,
  quantity,
  spot,
  sum,
} from './amounts.js';
import { condition } from './conditions.js';
import type { Phrase } from './phrase.js';

// belt = QUANTITY .
export function belt(p: Phrase): Quantity {
  const length = quantity(p);
  needUnit(p, length, 'a length such as `180 cm`');
  return length;
}

// value = sum { "," "but" sum "in" NAME { "or" NAME } } .
export function value(p: Phrase): ByPhase<Sum> {
  return byPhase(p, sum);
}

// place = spot { "," "but" spot "in" NAME { "or" NAME } } .
export function place(p: Phrase): ByPhase<Spot> {
  return byPhase(p, spot);
}

function byPhase<T>(p: Phrase, read: (p: Phrase) => T): ByPhase<T> {
  const base = read(p);
  const exceptions: { value: T; phases: NameRef[] }[] = [];
  while (p.accept(',')) {
    p.expect('but');
    const exception = read(p);
    p.expect('in');
    const phases = [p.name('a name of a phase')];
    while (p.accept('or')) phases.push(p.name('a name of a phase'));
    exceptions.push({ value: exception, phases });
  }
  return { base, exceptions };
}

// draw = choices "," "every" occasion { "," habit } .
export function draw(p: Phrase): { choices: Choices; every: Occasion; habits: Habit[] } {
  const among = choices(p);
  p.expect(',');
  p.expect('every');
  const every = occasion(p);
  const habits: Habit[] = [];
  while (p.accept(',')) habits.push(habit(p));
  return { choices: among, every, habits };
}

// occasion = "lap" | "phase" | "cell" | "session" | "visit to" NAME | "firing of" NAME .
export function occasion(p: Phrase): Occasion {
  const mark = p.mark();
  if (p.accept('visit to')) {
    const to = p.name('a name of a place');
    return { kind: 'visit', to, at: p.since(mark) };
  }
  if (p.accept('firing of')) {
    const of = p.name('a name of a rule');
    return { kind: 'firing', of, at: p.since(mark) };
  }
  const kind = p.oneOf(['lap', 'phase', 'cell', 'session']) ?? p.fail();
  return { kind, at: p.since(mark) };
}

// habit = "weighted" NUMBER "to" NUMBER { "to" NUMBER } | "in shuffled blocks of" NUMBER
//       | "at most" NUMBER "in a row" | "at least" ( amount | NUMBER ) "from the last"
//       | "in steps of" ( amount | NUMBER ) | "sealed" .
export function habit(p: Phrase): Habit {
  const mark = p.mark();
  if (p.accept('weighted')) {
    const weights = [number(p)];
    do {
      p.expect('to');
      weights.push(number(p));
    } while (p.isAt('to'));
    return { kind: 'weighted', weights, at: p.since(mark) };
  }
  if (p.accept('in shuffled blocks of')) {
    return { kind: 'blocks', size: number(p), at: p.since(mark) };
  }
  if (p.accept('sealed')) return { kind: 'sealed', at: p.since(mark) };
  if (p.accept('at most')) {
    const most = number(p);
    p.expect('in a row');
    return { kind: 'run', most, at: p.since(mark) };
  }
  if (p.accept('at least')) {
    const least = amountOrCount(p);
    p.expect('from the last');
    return { kind: 'apart', least, at: p.since(mark) };
  }
  p.expect('in steps of');
  return { kind: 'steps', of: amountOrCount(p), at: p.since(mark) };
}

// operator = choices "," [ "in steps of" ( amount | NUMBER ) "," ] "at first" option .
export function operator(p: Phrase): { choices: Choices; step?: Sum; first: Option } {
  const among = choices(p);
  p.expect(',');
  const stepped = p.accept('in steps of');
  const step = stepped ? { step: amountOrCount(p) } : {};
  if (stepped) p.expect(',');
  p.expect('at first');
  return { choices: among, ...step, first: option(p) };
}

// phase = ( "for" length { "or" length } | "until" condition | "to the end" ) [ "," "at lap end" ] .
export function phase(p: Phrase): Pick<PhaseDecl, 'course' | 'atLapEnd'> {
  const course = phaseCourse(p);
  const atLapEnd = p.accept(',');
  if (atLapEnd) p.expect('at lap end');
  return { course, atLapEnd };
}

function phaseCourse(p: Phrase): PhaseDecl['course'] {
  if (p.accept('for')) {
    const lengths = [length(p)];
    while (p.accept('or')) lengths.push(length(p));
    return { kind: 'for', lengths };
  }
  if (p.accept('until')) return { kind: 'until', condition: condition(p) };
  p.expect('to the end');
  return { kind: 'to the end' };
}

// length = count ( "lap" | "laps" ) | amount .
export function length(p: Phrase): PhaseLength {
  const mark = p.mark();
  const found = amountOrCount(p);
  if (p.accept('laps') || p.accept('lap')) return { kind: 'laps', count: found, at: p.since(mark) };
  needUnit(p, found, 'a time such as `15 min`, or `laps`');
  return { kind: 'time', time: found, at: p.since(mark) };
}
