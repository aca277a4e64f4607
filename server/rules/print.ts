import type {
  Action,
  ByPhase,
  Choices,
  DrawDecl,
  Habit,
  OperatorDecl,
  Option,
  PhaseDecl,
  RuleDecl,
  RulesFile,
  Spot,
  Sum,
} from './ast.js';
import { printAction, printAsked, printCap, printWhen } from './printRule.js';
import { printCondition, printOption, printRange, printSum } from './printSum.js';
import { unitOf } from './text/amounts.js';

const WIDTH = 100;

/**
 * Prints a parsed file back as text that parses to the same tree, but for where things stand.
 * What an `include` brought in is printed as the file's own.
 */
export function printRules(file: RulesFile): string {
  const sections: string[] = [
    `title: ${printTitle(file.title)}\nbelt: ${file.beltLengthCm.written}\n`,
    section('values', file.values, ({ value }) => byPhase(value, printSum)),
    section('operator', file.operator, printOperator),
    section('tables', file.tables, (table) => table.file.name),
    section('draws', file.draws, printDraw),
    section('places', file.places, ({ place }) => byPhase(place, printSpot)),
    section('phases', file.phases, printPhase),
    `rules:\n${file.rules.map(printRule).join('')}`,
    file.end ? line('', 'end', printCondition(file.end)) : '',
  ];
  return sections.filter((text) => text !== '').join('\n');
}

function section<T extends { readonly name: { readonly name: string } }>(
  key: string,
  decls: readonly T[],
  print: (decl: T) => string,
): string {
  if (decls.length === 0) return '';
  return `${key}:\n${decls.map((decl) => line('  ', decl.name.name, print(decl))).join('')}`;
}

/** Plain where YAML reads it as it stands, else in quotes: there are no escapes. */
function printTitle(title: string): string {
  if (/^[\p{L}\p{N}][\p{L}\p{N} ,.()_-]*$/u.test(title) && !title.endsWith(' ')) return title;
  return /["\\]/.test(title) ? `'${title}'` : `"${title}"`;
}

/** A `key: phrase` line, gone on over deeper lines where it is long. */
function line(indent: string, key: string, phrase: string): string {
  return `${wrapped(`${indent}${key}: `, phrase, `${indent}    `)}\n`;
}

function wrapped(head: string, phrase: string, indent: string): string {
  const lines: string[] = [];
  let now = head;
  let fresh = true;
  for (const word of phrase.split(' ')) {
    // A line that began with a minus would look like a list.
    const full = now.length + word.length + 1 > WIDTH && word !== '-';
    if (full && !fresh) {
      lines.push(now);
      now = indent;
      fresh = true;
    }
    now += fresh ? word : ` ${word}`;
    fresh = false;
  }
  return [...lines, now].join('\n');
}

function byPhase<T>({ base, exceptions }: ByPhase<T>, print: (value: T) => string): string {
  const rest = exceptions.map(
    ({ value, phases }) =>
      `, but ${print(value)} in ${phases.map(({ name }) => name).join(' or ')}`,
  );
  return print(base) + rest.join('');
}

export function printSpot({ from, to }: Spot): string {
  return to ? printRange(from, to) : printSum(from);
}

export function printChoices(choices: Choices): string {
  if (choices.kind === 'between') return printRange(choices.from, choices.to);
  return printOptions(choices.options);
}

/** With the unit once at the end where all share it. */
function printOptions(options: readonly Option[]): string {
  const units = new Set(
    options.map((option) => (option.kind === 'quantity' ? unitOf(option) : '')),
  );
  const [unit] = units;
  if (units.size > 1 || !unit) return options.map(printOption).join(' or ');
  const numbers = options.map((option) => printOption(option).slice(0, -unit.length).trimEnd());
  return `${numbers.join(' or ')} ${unit}`;
}

export function printOccasion({ every }: DrawDecl): string {
  if (every.kind === 'visit') return `visit to ${every.to.name}`;
  return every.kind === 'firing' ? `firing of ${every.of.name}` : every.kind;
}

export function printHabit(habit: Habit): string {
  switch (habit.kind) {
    case 'weighted':
      return `weighted ${habit.weights.join(' to ')}`;
    case 'blocks':
      return `in shuffled blocks of ${habit.size}`;
    case 'run':
      return `at most ${habit.most} in a row`;
    case 'apart':
      return `at least ${printSum(habit.least)} from the last`;
    case 'sealed':
      return 'sealed';
    case 'steps':
      return `in steps of ${printSum(habit.of)}`;
  }
}

export function printDraw(draw: DrawDecl): string {
  const habits = draw.habits.map((habit) => `, ${printHabit(habit)}`).join('');
  return `${printChoices(draw.choices)}, every ${printOccasion(draw)}${habits}`;
}

function printOperator({ choices, step, first }: OperatorDecl): string {
  const steps = step ? `, in steps of ${printSum(step)}` : '';
  return `${printChoices(choices)}${steps}, at first ${printOption(first)}`;
}

export function printCourse({ course }: PhaseDecl): string {
  if (course.kind === 'to the end') return 'to the end';
  if (course.kind === 'until') return `until ${printCondition(course.condition)}`;
  const lengths = course.lengths.map((length) =>
    length.kind === 'laps' ? laps(length.count) : printSum(length.time),
  );
  return `for ${lengths.join(' or ')}`;
}

function laps(count: Sum): string {
  const text = printSum(count);
  return `${text} ${text === '1' ? 'lap' : 'laps'}`;
}

function printPhase(phase: PhaseDecl): string {
  return `${printCourse(phase)}${phase.atLapEnd ? ', at lap end' : ''}`;
}

function printRule(rule: RuleDecl): string {
  const indent = '    ';
  const keys = [
    line(indent, 'when', printWhen(rule.when)),
    rule.if ? line(indent, 'if', printCondition(rule.if)) : '',
    rule.chance ? line(indent, 'chance', rule.chance.written) : '',
    rule.sham ? line(indent, 'sham', printCondition(rule.sham)) : '',
    printActions(rule.do, indent),
    rule.limits.length > 0 ? line(indent, 'limit', rule.limits.map(printCap).join(', ')) : '',
    rule.within ? line(indent, 'within', printSum(rule.within)) : '',
    rule.asked ? line(indent, 'asked', printAsked(rule.asked)) : '',
  ];
  return `  ${rule.name.name}:\n${keys.join('')}`;
}

function printActions(actions: readonly Action[], indent: string): string {
  const [only] = actions;
  if (actions.length === 1 && only) return line(indent, 'do', printAction(only));
  const items = actions.map((action) =>
    wrapped(`${indent}  - `, printAction(action), `${indent}      `),
  );
  return `${indent}do:\n${items.join('\n')}\n`;
}
