import type { DrawDecl, Habit } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { intervalOf, intervalOfChoices } from '../interval.js';

/** Weights, blocks, runs, steps and least distances that do not fit the choices. */
export const drawHabits: Check = (context) => {
  for (const draw of context.file.draws) {
    doubled(context, draw);
    weights(context, draw);
    blocks(context, draw);
    runs(context, draw);
    steps(context, draw);
    apart(context, draw);
  }
};

const find = <K extends Habit['kind']>(
  { habits }: DrawDecl,
  kind: K,
): (Habit & { kind: K }) | undefined =>
  habits.find((habit) => habit.kind === kind) as (Habit & { kind: K }) | undefined;

const optionsOf = ({ choices }: DrawDecl): number =>
  choices.kind === 'options' ? choices.options.length : Infinity;

function doubled({ problems }: CheckContext, { habits }: DrawDecl): void {
  const seen = new Map<string, Habit>();
  for (const habit of habits) {
    const first = seen.get(habit.kind);
    if (!first) seen.set(habit.kind, habit);
    else {
      problems.report('doubledKey', habit.at, 'said twice', {
        also: [{ at: first.at, note: 'first said here' }],
      });
    }
  }
}

function weights({ problems }: CheckContext, draw: DrawDecl): void {
  const habit = find(draw, 'weighted');
  if (!habit) return;
  const wanted = optionsOf(draw);
  if (habit.weights.length !== wanted) {
    const expected =
      wanted === Infinity
        ? 'choices one by one, `20 or 60 cm`: a range has no weights'
        : `${wanted} weights, one for each choice`;
    problems.report('weightsMismatch', habit.at, `${habit.weights.length} weights`, {
      expected,
      also: [{ at: draw.choices.at, note: 'the choices' }],
    });
  } else if (!habit.weights.every((weight) => weight > 0)) {
    problems.report('weightsMismatch', habit.at, 'a weight of nothing', {
      expected: 'weights above 0',
    });
  }
}

function blocks({ problems }: CheckContext, draw: DrawDecl): void {
  const habit = find(draw, 'blocks');
  if (!habit) return;
  const also = [{ at: draw.choices.at, note: 'the choices' }];
  const many = optionsOf(draw);
  if (many === Infinity) {
    problems.report('blockMismatch', habit.at, 'a range cannot be dealt in blocks', {
      expected: 'choices one by one: `20 or 60 or 140 cm`',
      also,
    });
    return;
  }
  const parts = find(draw, 'weighted')?.weights ?? new Array<number>(many).fill(1);
  const total = parts.reduce((sum, part) => sum + part, 0);
  const whole = parts.every((part) => Number.isInteger((habit.size * part) / total));
  if (habit.size >= 1 && Number.isInteger(habit.size) && whole) return;
  problems.report(
    'blockMismatch',
    habit.at,
    `a block of ${habit.size} cannot balance ${many} choices`,
    {
      expected: `a multiple of ${Number.isInteger(total) ? total : many}`,
      also,
    },
  );
}

function runs({ problems }: CheckContext, draw: DrawDecl): void {
  const habit = find(draw, 'run');
  if (!habit) return;
  const also = [{ at: draw.choices.at, note: 'the choices' }];
  const report = (message: string, expected: string): void => {
    problems.report('drawImpossible', habit.at, message, { expected, also });
  };
  const many = optionsOf(draw);
  if (!Number.isInteger(habit.most) || habit.most < 1)
    report('a run is of 1 or more', 'a whole number from 1');
  else if (many === Infinity) report('a range has no runs', '`at least 10 cm from the last`');
  else if (many < 2) report('one choice is always in a row', 'two choices or more');
  else if (!blockKeepsRun(draw, habit.most))
    report('no order of a block keeps to this', 'a longer run, or other weights');
}

/** A block with c of one choice and r of the others splits c into r + 1 runs at most. */
function blockKeepsRun(draw: DrawDecl, most: number): boolean {
  const block = find(draw, 'blocks');
  if (!block) return true;
  const parts = find(draw, 'weighted')?.weights ?? new Array<number>(optionsOf(draw)).fill(1);
  const total = parts.reduce((sum, part) => sum + part, 0);
  const commonest = (block.size * Math.max(...parts)) / total;
  return commonest <= most * (block.size - commonest + 1);
}

function steps({ symbols, problems }: CheckContext, draw: DrawDecl): void {
  const habit = find(draw, 'steps');
  if (!habit) return;
  const also = [{ at: draw.choices.at, note: 'the choices' }];
  const step = intervalOf(habit.of, symbols);
  if (draw.choices.kind !== 'between') {
    problems.report('drawImpossible', habit.at, 'only a range has steps', {
      expected: '`20 to 160 cm`',
      also,
    });
    return;
  }
  const from = intervalOf(draw.choices.from, symbols);
  const to = intervalOf(draw.choices.to, symbols);
  const width = to.high - from.low;
  if (step.low <= 0 || step.low > width) {
    problems.report('drawImpossible', habit.at, 'no step of this size fits the range', {
      expected: 'a step above 0 and within the range',
      also,
    });
  }
}

function apart(context: CheckContext, draw: DrawDecl): void {
  const habit = find(draw, 'apart');
  if (!habit) return;
  const { symbols, problems } = context;
  const also = [{ at: draw.choices.at, note: 'the choices' }];
  const report = (message: string, expected: string): void => {
    problems.report('drawImpossible', habit.at, message, { expected, also });
  };
  const kind = symbols.yields(draw.choices).kind;
  if (kind === 'word' || kind === 'span') {
    report('there is no distance between these choices', '`at most 2 in a row`');
    return;
  }
  if (kind === 'unclear') return;
  const least = intervalOf(habit.least, symbols).high;
  const reach = farthestApart(context, draw);
  if (reach.some((distance) => distance < least)) {
    report('from some choices no other is as far as this', 'a smaller distance or a wider range');
  }
}

/**
 * For the choices from which least can be reached, the distance to the farthest other one; on a
 * belt, the shorter way round.
 */
export function farthestApart({ file, symbols }: CheckContext, draw: DrawDecl): number[] {
  const { choices } = draw;
  const around = isLength(symbols.yields(choices)) ? file.beltLengthCm.value : Infinity;
  const distance = (a: number, b: number): number => {
    const straight = Math.abs(a - b);
    return Math.min(straight, around - (straight % around));
  };
  if (choices.kind === 'between') {
    const { low, high } = intervalOfChoices(choices, symbols);
    if (!Number.isFinite(low) || !Number.isFinite(high)) return [];
    // From the middle of a range its ends are farthest, unless the belt is shorter that way.
    return [Math.min(Math.max((high - low) / 2, 0), around / 2)];
  }
  const points = choices.options.map((option) => intervalOf(option, symbols));
  if (points.some(({ low, high }) => low !== high)) return [];
  return points.map((a) => Math.max(...points.map((b) => distance(a.low, b.low))));
}

function isLength(found: { readonly kind: string; readonly dimension?: string }): boolean {
  return found.kind === 'point' || found.dimension === 'length';
}
