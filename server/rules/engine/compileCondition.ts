import type { Condition, Option, SpanExpr, Sum } from '../ast.js';
import { hasLearned, LEARNED } from '../learned.js';
import type { Builder } from './builder.js';
import { compileOption, compileSum, constantOf, spanOf } from './compileSum.js';
import type { Amount, Test } from './program.js';
import { FALSE, not, TRUE, type Truth, truth, UNKNOWN } from './truth.js';

/** A condition as a closure over the state. */
export function compileCondition(b: Builder, condition: Condition): Test {
  switch (condition.kind) {
    case 'and':
      return allOf(condition.terms.map((term) => compileCondition(b, term)));
    case 'or':
      return anyOf(condition.terms.map((term) => compileCondition(b, term)));
    case 'not': {
      const of = compileCondition(b, condition.of);
      return (s) => not(of(s));
    }
    case 'in': {
      const span = spanOf(b, condition.span);
      return (s) => {
        const tracker = s.spans[span]!;
        return s.placed && tracker.known ? truth(tracker.contains(s.relativeCounts)) : UNKNOWN;
      };
    }
    case 'still': {
      const below = b.facts.stillBelowCmPerS;
      return (s) => {
        const speed = s.instant.speedCmPerS;
        return speed < below && speed > -below ? TRUE : FALSE;
      };
    }
    case 'learned':
      return compileLearned(b, condition.span);
    case 'compare':
      return compare(
        condition.operator,
        compileSum(b, condition.left),
        compileSum(b, condition.right),
      );
    case 'is': {
      const is = compileIs(b, condition.subject, condition.options);
      return condition.negated ? (s) => not(is(s)) : is;
    }
    case 'is range': {
      const subject = compileSum(b, condition.subject);
      const from = compileSum(b, condition.from);
      const to = compileSum(b, condition.to);
      const { negated } = condition;
      return (s) => {
        const value = subject(s);
        const low = from(s);
        const high = to(s);
        if (Number.isNaN(value) || Number.isNaN(low) || Number.isNaN(high)) return UNKNOWN;
        return truth((value >= low && value <= high) !== negated);
      };
    }
    case 'multiple': {
      const subject = compileSum(b, condition.subject);
      const of = compileSum(b, condition.of);
      const { negated } = condition;
      return (s) => {
        const value = subject(s);
        const step = of(s);
        if (Number.isNaN(value) || Number.isNaN(step) || step === 0) return UNKNOWN;
        // "Longer than any number" is a multiple of none.
        const whole =
          value < Number.POSITIVE_INFINITY && value - Math.floor(value / step) * step === 0;
        return truth(whole !== negated);
      };
    }
  }
}

function allOf(terms: readonly Test[]): Test {
  const [first, second] = terms;
  if (terms.length === 2 && first && second) {
    return (s) => {
      const left = first(s);
      if (left === FALSE) return FALSE;
      const right = second(s);
      return Math.min(left, right) as Truth;
    };
  }
  return (s) => {
    let least: Truth = TRUE;
    for (let n = 0; n < terms.length; n++) {
      const value = terms[n]!(s);
      if (value === FALSE) return FALSE;
      if (value < least) least = value;
    }
    return least;
  };
}

function anyOf(terms: readonly Test[]): Test {
  return (s) => {
    let most: Truth = FALSE;
    for (let n = 0; n < terms.length; n++) {
      const value = terms[n]!(s);
      if (value === TRUE) return TRUE;
      if (value > most) most = value;
    }
    return most;
  };
}

function compare(operator: '<' | '<=' | '>' | '>=', left: Amount, right: Amount): Test {
  const bound = constantOf(right);
  if (bound !== undefined) return compareConstant(operator, left, bound);
  switch (operator) {
    case '<':
      return (s) => below(left(s), right(s));
    case '<=':
      return (s) => notAbove(left(s), right(s));
    case '>':
      return (s) => below(right(s), left(s));
    case '>=':
      return (s) => notAbove(right(s), left(s));
  }
}

/** Most comparisons are with a number from the file: one call less a frame. */
function compareConstant(operator: '<' | '<=' | '>' | '>=', left: Amount, bound: number): Test {
  switch (operator) {
    case '<':
      return (s) => below(left(s), bound);
    case '<=':
      return (s) => notAbove(left(s), bound);
    case '>':
      return (s) => below(bound, left(s));
    case '>=':
      return (s) => notAbove(bound, left(s));
  }
}

function below(a: number, b: number): Truth {
  return a < b ? TRUE : a >= b ? FALSE : UNKNOWN;
}
function notAbove(a: number, b: number): Truth {
  return a <= b ? TRUE : a > b ? FALSE : UNKNOWN;
}

function compileIs(
  b: Builder,
  subject: Sum | { readonly kind: 'phase word' },
  options: readonly Option[],
): Test {
  if (subject.kind === 'phase word') {
    const phases = options.map((o) => b.names.need((o as { name: string }).name, 'phase').index);
    return (s) => truth(phases.includes(s.phase));
  }
  if (subject.kind === 'name') {
    const meaning = b.names.get(subject.name);
    if (meaning?.kind === 'input') {
      const { index } = meaning;
      const high = options.some((o) => o.kind === 'name' && o.name === 'high');
      const low = options.some((o) => o.kind === 'name' && o.name === 'low');
      return (s) => truth(((s.instant.inputs >>> index) & 1) === 1 ? high : low);
    }
    if (
      (meaning?.kind === 'draw' || meaning?.kind === 'choice') &&
      meaning.decl.choices.kind === 'options' &&
      options.some((o) => o.kind === 'name')
    ) {
      const { index } = meaning;
      const words = meaning.decl.choices.options;
      const wanted = words.map((word) => options.some((o) => sameOption(word, o)));
      const isDraw = meaning.kind === 'draw';
      return (s) => {
        const option = isDraw ? s.draws[index]!.option : s.choices[index]!.option;
        return option < 0 ? UNKNOWN : truth(wanted[option]!);
      };
    }
  }
  const value = compileSum(b, subject);
  const amounts = options.map((option) => compileOption(b, option));
  return (s) => {
    const now = value(s);
    if (Number.isNaN(now)) return UNKNOWN;
    let result: Truth = FALSE;
    for (let n = 0; n < amounts.length; n++) {
      const amount = amounts[n]!(s);
      if (amount === now) return TRUE;
      if (Number.isNaN(amount)) result = UNKNOWN;
    }
    return result;
  };
}

function sameOption(a: Option, b: Option): boolean {
  if (a.kind === 'quantity') return b.kind === 'quantity' && a.value === b.value;
  return b.kind === 'name' && a.name === b.name;
}

function compileLearned(b: Builder, of: SpanExpr): Test {
  const span = spanOf(b, of);
  const { laps } = LEARNED;
  const tally = (what: 'waiting licks' | 'distance' | 'duration') => ({
    all: b.tally(what, -1, { laps }),
    inSpan: b.tally(what, span, { laps }),
  });
  const [licks, distance, duration] = [
    tally('waiting licks'),
    tally('distance'),
    tally('duration'),
  ];
  return (s) => {
    if (s.phaseLap() - 1 < laps) return UNKNOWN;
    const over = (index: number) => s.tallies[index]!.overLaps(laps, s.lapOrdinal);
    const learned = hasLearned({
      ...{ licks: over(licks.all), licksInSpan: over(licks.inSpan) },
      ...{ distance: over(distance.all), distanceInSpan: over(distance.inSpan) },
      ...{ duration: over(duration.all), durationInSpan: over(duration.inSpan) },
    });
    return learned === undefined ? UNKNOWN : truth(learned);
  };
}
