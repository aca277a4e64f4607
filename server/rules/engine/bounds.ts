import type { Choices, Option, Sum } from '../ast.js';
import type { Names } from './names.js';

/** The least and the most that an amount can be, from the file alone. */
export interface Bounds {
  readonly least: number;
  readonly most: number;
}

const ANY: Bounds = { least: Number.NEGATIVE_INFINITY, most: Number.POSITIVE_INFINITY };

/** Interval arithmetic over an amount; a measure may be anything. */
export function boundsOf(sum: Sum, names: Names): Bounds {
  switch (sum.kind) {
    case 'quantity':
      return { least: sum.value, most: sum.value };
    case 'negate': {
      const of = boundsOf(sum.of, names);
      return { least: -of.most, most: -of.least };
    }
    case 'binary': {
      const left = boundsOf(sum.left, names);
      const right = boundsOf(sum.right, names);
      if (sum.operator === '+') {
        return { least: left.least + right.least, most: left.most + right.most };
      }
      if (sum.operator === '-') {
        return { least: left.least - right.most, most: left.most - right.least };
      }
      const factor = names.factorOf(sum);
      const pairs = [left.least, left.most].flatMap((a) =>
        [right.least, right.most].map((b) => (sum.operator === '*' ? a * b : a / b) * factor),
      );
      if (sum.operator === '/' && right.least <= 0 && right.most >= 0) return ANY;
      return pairs.some(Number.isNaN)
        ? ANY
        : { least: Math.min(...pairs), most: Math.max(...pairs) };
    }
    case 'name': {
      const meaning = names.get(sum.name);
      if (meaning?.kind === 'value') {
        const { base, exceptions } = meaning.decl.value;
        return union([base, ...exceptions.map((e) => e.value)].map((v) => boundsOf(v, names)));
      }
      if (meaning?.kind === 'draw' || meaning?.kind === 'choice') {
        return choiceBounds(meaning.decl.choices, names);
      }
      return ANY;
    }
    default:
      return ANY;
  }
}

export function choiceBounds(choices: Choices, names: Names): Bounds {
  if (choices.kind === 'between') {
    return union([boundsOf(choices.from, names), boundsOf(choices.to, names)]);
  }
  const optionBounds = (o: Option): Bounds =>
    o.kind === 'quantity' ? { least: o.value, most: o.value } : ANY;
  return union(choices.options.map(optionBounds));
}

function union(all: readonly Bounds[]): Bounds {
  return {
    least: Math.min(...all.map((b) => b.least)),
    most: Math.max(...all.map((b) => b.most)),
  };
}
