import type { Condition, Mark, Measure, Option, Scope, SpanExpr, Sum } from './ast.js';
import { unitOf } from './text/amounts.js';

/** How tightly an operand must hold together: a sum, a product, a factor. */
type Tightness = 0 | 1 | 2;

/** Prints an amount, with parentheses only where the tree needs them. */
export function printSum(sum: Sum, tightness: Tightness = 0): string {
  switch (sum.kind) {
    case 'quantity':
      return sum.written;
    case 'name':
      return sum.name;
    case 'edge':
      return `${sum.edge} of ${sum.of.name}`;
    case 'negate':
      return enclosed(`-${printSum(sum.of, 1)}`, tightness > 0);
    case 'binary': {
      const product = sum.operator === '*' || sum.operator === '/';
      const left = printSum(sum.left, product ? 1 : 0);
      const right = printSum(sum.right, product ? 2 : 1);
      return enclosed(`${left} ${sum.operator} ${right}`, tightness > (product ? 1 : 0));
    }
    default:
      return printMeasure(sum);
  }
}

function enclosed(text: string, needed: boolean): string {
  return needed ? `(${text})` : text;
}

/** `85 to 95 cm`: the unit once where both sides share it. */
export function printRange(from: Sum, to: Sum): string {
  const low = printSum(from);
  const high = printSum(to);
  if (from.kind !== 'quantity' || to.kind !== 'quantity') return `${low} to ${high}`;
  const unit = unitOf(to);
  if (unit === '' || unitOf(from) !== unit) return `${low} to ${high}`;
  return `${low.slice(0, -unit.length).trimEnd()} to ${high}`;
}

export function printSpan(span: SpanExpr): string {
  return span.kind === 'name' ? span.name : printRange(span.from, span.to);
}

export function printOption(option: Option): string {
  return option.kind === 'quantity' ? option.written : option.name;
}

export function printScope(scope: Scope): string {
  if (scope.kind === 'this') return `this ${scope.stretch}`;
  if (scope.kind === 'last time') return `over the last ${printSum(scope.time)}`;
  const count = printSum(scope.count);
  return `over the last ${count === '1' ? 'lap' : `${count} laps`}`;
}

function printMeasure(measure: Measure): string {
  switch (measure.kind) {
    case 'measure':
      return measure.measure;
    case 'since':
      return `${measure.unit} since ${printMark(measure.mark)}`;
    case 'firings': {
      const which = measure.which === 'all' ? '' : `${measure.which} `;
      return `${which}firings of ${measure.of.name} ${printScope(measure.scope)}`;
    }
    case 'predicted':
      return `predicted ${measure.what} of ${measure.of.name}`;
    case 'scoped': {
      const place = measure.within ? ` in ${printSpan(measure.within)}` : '';
      return `${measure.measure}${place} ${printScope(measure.scope)}`;
    }
  }
}

function printMark(mark: Mark): string {
  if (mark.kind === 'name mark') return `${mark.name.name} ${mark.event}`;
  if (mark.kind === 'place mark') return `${mark.event} ${mark.place.name}`;
  return mark.within ? `lick in ${mark.within.name}` : 'lick';
}

/** Prints a condition; `inner` puts `and` and `or` in parentheses. */
export function printCondition(condition: Condition, inner = false): string {
  switch (condition.kind) {
    case 'and':
    case 'or': {
      const terms = condition.terms.map((term) => printCondition(term, true));
      return enclosed(terms.join(` ${condition.kind} `), inner);
    }
    case 'not': {
      const plain = !['and', 'or', 'not'].includes(condition.of.kind);
      return `not ${plain ? printCondition(condition.of) : `(${printCondition(condition.of)})`}`;
    }
    case 'in':
      return `in ${printSpan(condition.span)}`;
    case 'still':
      return 'still';
    case 'learned':
      return `learned in ${printSpan(condition.span)}`;
    case 'compare':
      return `${printSum(condition.left)} ${condition.operator} ${printSum(condition.right)}`;
    case 'is': {
      const subject =
        condition.subject.kind === 'phase word' ? 'phase' : printSum(condition.subject);
      return `${subject} ${is(condition)} ${condition.options.map(printOption).join(' or ')}`;
    }
    case 'is range':
      return `${printSum(condition.subject)} ${is(condition)} ${printRange(condition.from, condition.to)}`;
    case 'multiple':
      return `${printSum(condition.subject)} ${is(condition)} a multiple of ${printSum(condition.of)}`;
  }
}

function is({ negated }: { readonly negated: boolean }): string {
  return negated ? 'is not' : 'is';
}
