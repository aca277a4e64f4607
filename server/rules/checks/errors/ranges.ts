import type { Choices, Sum } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { intervalOf, intervalOfChoices } from '../interval.js';
import { walk } from '../walk.js';

/** Numbers that make no sense where they stand: no time at all, half a lap, a chance of 120 %. */
export const ranges: Check = (context) => {
  const { file, problems } = context;
  for (const { chance, limits, within, asked } of file.rules) {
    if (chance && (chance.value < 0 || chance.value > 1)) {
      problems.report('outOfRange', chance.at, `a chance of ${chance.written}`, {
        expected: '0 to 100 %',
      });
    }
    for (const cap of limits) {
      if (cap.kind === 'per') {
        whole(context, cap.count, 'a limit');
        if (typeof cap.per !== 'string') positive(context, cap.per, 'a window');
      } else if (cap.kind === 'apart laps') whole(context, cap.laps, 'a gap in laps');
      else positive(context, cap.time, 'a gap');
    }
    if (within) positive(context, within, '`within`');
    if (asked?.laps) whole(context, asked.laps, '`asked`');
  }
  walk(file.rules, (node) => {
    if (node.kind === 'every') positive(context, node.interval as Sum, 'an interval');
    if (node.kind === 'after' || node.delay) positive(context, node.delay as Sum, 'a delay');
    if (node.kind === 'becomes' && node.lasting)
      positive(context, node.lasting as Sum, 'a stretch of time');
    if (node.kind === 'bout') {
      whole(context, node.count as Sum, 'a bout');
      positive(context, node.time as Sum, 'a stretch of time');
    }
    if (node.kind === 'give') positive(context, node.volume as Sum, 'a volume');
    if (node.kind === 'pulse') positive(context, node.width as Sum, 'a pulse');
    if (node.rate) positive(context, node.rate as Sum, 'a rate');
    if (node.times) whole(context, node.times as Sum, 'a train');
    if (node.upTo) positive(context, node.upTo as Sum, '`up to`');
  });
  walk(file, (node) => {
    if (node.kind === 'multiple') whole(context, node.of as Sum, 'a multiple');
    if (node.kind === 'last laps') whole(context, node.count as Sum, 'a window');
    if (node.kind === 'last time') positive(context, node.time as Sum, 'a window');
  });
  for (const { course } of file.phases) {
    for (const length of course.kind === 'for' ? course.lengths : []) {
      if (length.kind === 'laps') whole(context, length.count, 'a phase');
      else positive(context, length.time, 'a phase');
    }
  }
  for (const { choices, step, first } of file.operator) {
    const { low, high } = intervalOfChoices(choices, context.symbols);
    if (
      choices.kind === 'between' &&
      first.kind === 'quantity' &&
      !(first.value >= low && first.value <= high)
    ) {
      problems.report('outOfRange', first.at, `at first ${first.written}, outside the bounds`, {
        expected: 'an amount between the bounds',
        also: [{ at: choices.at, note: 'the bounds' }],
      });
    }
    if (step) stepped(context, choices, step);
    if (choices.kind === 'options' && first.kind === 'quantity') {
      const same = choices.options.some((o) => o.kind === 'quantity' && o.value === first.value);
      if (!same)
        problems.report('outOfRange', first.at, `${first.written} is none of the choices`, {
          expected: 'one of the choices',
        });
    }
  }
};

/** Steps need bounds to go between, and room for one at least. */
function stepped({ symbols, problems }: CheckContext, choices: Choices, step: Sum): void {
  if (choices.kind === 'options') {
    problems.report('outOfRange', step.at, 'steps between choices that are all named', {
      expected: 'bounds such as `20 to 140 cm`, or no steps',
    });
    return;
  }
  const bounds = intervalOfChoices(choices, symbols);
  const { low, high } = intervalOf(step, symbols);
  if (low > 0 && high <= bounds.high - bounds.low) return;
  problems.report('outOfRange', step.at, 'a step that does not fit between the bounds', {
    expected: 'more than 0, and no more than from bound to bound',
    also: [{ at: choices.at, note: 'the bounds' }],
  });
}

function positive({ symbols, problems }: CheckContext, sum: Sum, what: string): void {
  const { low } = intervalOf(sum, symbols);
  if (low > 0 || low === -Infinity) return;
  problems.report('outOfRange', sum.at, `${what} must be more than nothing`, {
    expected: 'more than 0',
  });
}

function whole({ symbols, problems }: CheckContext, sum: Sum, what: string): void {
  const { low, high } = intervalOf(sum, symbols);
  const fine = low >= 1 && (low !== high || Number.isInteger(low));
  if (fine || low === -Infinity) return;
  problems.report('outOfRange', sum.at, `${what} takes a whole number from 1`, {
    expected: '1, 2, 3, ...',
  });
}
