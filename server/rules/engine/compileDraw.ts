import { isArmable } from '../armable.js';
import type { Choices, DrawDecl, Habit, OperatorDecl, Option } from '../ast.js';
import type { Builder } from './builder.js';
import { compileOption, compileSum, constant, spanOf } from './compileSum.js';
import { namesUsed } from './names.js';
import type { ChoiceSpec, DrawSpec, ValueSpec } from './program.js';

/** How finely a number between bounds is drawn where no step is said, per base unit. */
const FINENESS = { length: 100, time: 1, volume: 1, speed: 100, rate: 100, number: 1000 } as const;

export function compileDraw(b: Builder, decl: DrawDecl, index: number): DrawSpec {
  const habit = <K extends Habit['kind']>(kind: K): (Habit & { kind: K }) | undefined =>
    decl.habits.find((h) => h.kind === kind) as (Habit & { kind: K }) | undefined;
  const dimension = b.names.dimensionOfChoices(decl.choices);
  const steps = habit('steps');
  const { choices, every } = decl;
  if (every.kind === 'visit') {
    const span = b.spans[spanOf(b, every.to)]!;
    span.tracked = true;
    span.visitDraws.push(index);
  }
  const options = optionsOf(b, choices);
  const apart = habit('apart');
  const between =
    choices.kind === 'between'
      ? {
          between: {
            from: compileSum(b, choices.from),
            to: compileSum(b, choices.to),
            numerator: steps ? compileSum(b, steps.of) : constant(1),
            denominator: steps ? 1 : FINENESS[dimension],
          },
        }
      : {};
  return {
    name: decl.name.name,
    dimension,
    options,
    weights: habit('weighted')?.weights ?? options.map(() => 1),
    ...between,
    blockSize: habit('blocks')?.size ?? 0,
    mostInARow: habit('run')?.most ?? 0,
    apart: apart ? compileSum(b, apart.least) : undefined,
    every: every.kind,
  };
}

export function compileChoice(b: Builder, decl: OperatorDecl, places: Set<string>): ChoiceSpec {
  const { choices, first } = decl;
  const option =
    choices.kind === 'options' ? choices.options.findIndex((o) => sameOption(o, first)) : -1;
  const between =
    choices.kind === 'between'
      ? { between: { from: compileSum(b, choices.from), to: compileSum(b, choices.to) } }
      : {};
  return {
    name: decl.name.name,
    dimension: b.names.dimensionOfChoices(choices),
    options: optionsOf(b, choices),
    ...between,
    first: { value: first.kind === 'quantity' ? first.value : Number.NaN, option },
    step: decl.step ? compileSum(b, decl.step) : undefined,
    movesPlace: places.has(decl.name.name),
    rearms: b.file.rules.flatMap((rule, index) =>
      isArmable(rule, b.facts) && namesUsed(rule, b.names).has(decl.name.name) ? [index] : [],
    ),
  };
}

function optionsOf(b: Builder, choices: Choices): ValueSpec[] {
  if (choices.kind === 'between') return [];
  return choices.options.map((option) => ({
    amount: compileOption(b, option),
    word: option.kind === 'name' ? option.name : '',
  }));
}

function sameOption(a: Option, b: Option): boolean {
  if (a.kind === 'quantity') return b.kind === 'quantity' && a.value === b.value;
  return b.kind === 'name' && a.name === b.name;
}

/** Every name that some place, span or point of the file depends on. */
export function namesOfPlaces(b: Builder): Set<string> {
  const found = namesUsed(b.file.places, b.names);
  visit([b.file.rules, b.file.phases, b.file.draws, b.file.end], (node) => {
    const { kind } = node as { kind?: unknown };
    if (kind === 'in' || kind === 'learned' || kind === 'enters' || kind === 'leaves') {
      namesUsed((node as { span: unknown }).span, b.names, found);
    } else if (kind === 'reaches' || kind === 'place mark') {
      namesUsed((node as { place: unknown }).place, b.names, found);
    } else if (kind === 'visit') namesUsed((node as { to: unknown }).to, b.names, found);
    const { within } = node as { within?: unknown };
    // A rule's own `within` is a distance, not a place.
    if (within !== undefined && !('when' in node)) namesUsed(within, b.names, found);
  });
  return found;
}

/** Calls back for every object in a piece of the tree. */
export function visit(node: unknown, call: (node: object) => void): void {
  if (Array.isArray(node)) for (const item of node) visit(item, call);
  else if (node !== null && typeof node === 'object') {
    call(node);
    for (const [key, child] of Object.entries(node)) if (key !== 'at') visit(child, call);
  }
}
