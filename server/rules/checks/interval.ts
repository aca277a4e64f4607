import type { ByPhase, Choices, Option, Spot, Sum } from '../ast.js';
import { baseFactor } from './dimensions.js';
import { powersOfSum } from './powers.js';
import type { Symbols } from './symbols.js';

/** The least and the most that an amount can be, in base units. */
export interface Interval {
  readonly low: number;
  readonly high: number;
}

const ANY: Interval = { low: -Infinity, high: Infinity };
const FROM_ZERO: Interval = { low: 0, high: Infinity };
const DEEPEST_NAMES = 40;

/**
 * Bounds an amount from the file alone (interval arithmetic: R. E. Moore, *Interval Analysis*, 1966).
 * A name that differs by phase counts with all its values, or with that of `phase`.
 */
export function intervalOf(sum: Sum, symbols: Symbols, phase?: string, depth = 0): Interval {
  switch (sum.kind) {
    case 'quantity':
      return { low: sum.value, high: sum.value };
    case 'negate': {
      const { low, high } = intervalOf(sum.of, symbols, phase, depth);
      return { low: -high, high: -low };
    }
    case 'name':
      return depth > DEEPEST_NAMES ? ANY : intervalOfName(sum.name, symbols, phase, depth + 1);
    case 'edge': {
      const spots = spotsOf(sum.of.name, symbols, phase);
      return hull(
        spots.map((spot) =>
          intervalOf(
            (sum.edge === 'start' ? spot.from : spot.to) ?? spot.from,
            symbols,
            phase,
            depth + 1,
          ),
        ),
      );
    }
    case 'binary': {
      const left = intervalOf(sum.left, symbols, phase, depth);
      const right = intervalOf(sum.right, symbols, phase, depth);
      return combine(sum.operator, left, right, factorOf(sum, symbols));
    }
    case 'measure':
      if (sum.measure === 'position') return { low: 0, high: symbols.file.beltLengthCm.value };
      return sum.measure === 'speed' ? ANY : FROM_ZERO;
    case 'scoped':
      if (sum.measure === 'mean speed') return ANY;
      return sum.measure === 'share of licks' ? { low: 0, high: 1 } : FROM_ZERO;
    case 'predicted':
      if (sum.what === 'asymmetry') return { low: -1, high: 1 };
      if (sum.what === 'shift') return ANY;
      return { low: 0, high: symbols.file.beltLengthCm.value };
    default:
      return FROM_ZERO;
  }
}

function factorOf(sum: Sum & { kind: 'binary' }, symbols: Symbols): number {
  if (sum.operator === '+' || sum.operator === '-') return 1;
  const left = powersOfSum(sum.left, symbols);
  const right = powersOfSum(sum.right, symbols);
  return left && right ? baseFactor(left, right, sum.operator === '*' ? 1 : -1) : 1;
}

function combine(
  operator: '+' | '-' | '*' | '/',
  a: Interval,
  b: Interval,
  factor: number,
): Interval {
  if (operator === '+') return { low: a.low + b.low, high: a.high + b.high };
  if (operator === '-') return { low: a.low - b.high, high: a.high - b.low };
  if (operator === '/' && b.low <= 0 && b.high >= 0) return ANY;
  const ends = [a.low, a.high].flatMap((x) =>
    [b.low, b.high].map((y) => (operator === '*' ? x * y : x / y) * factor),
  );
  if (ends.some(Number.isNaN)) return ANY;
  return { low: Math.min(...ends), high: Math.max(...ends) };
}

function intervalOfName(
  name: string,
  symbols: Symbols,
  phase: string | undefined,
  depth: number,
): Interval {
  const symbol = symbols.get(name);
  switch (symbol?.kind) {
    case 'value':
      return hull(
        valuesIn(symbol.decl.value, phase).map((sum) => intervalOf(sum, symbols, phase, depth)),
      );
    case 'place':
      return hull(
        valuesIn(symbol.decl.place, phase).flatMap((spot) =>
          [spot.from, ...(spot.to ? [spot.to] : [])].map((sum) =>
            intervalOf(sum, symbols, phase, depth),
          ),
        ),
      );
    case 'draw':
    case 'choice':
      return intervalOfChoices(symbol.decl.choices, symbols, phase, depth);
    default:
      return ANY;
  }
}

export function intervalOfChoices(
  choices: Choices,
  symbols: Symbols,
  phase?: string,
  depth = 0,
): Interval {
  const ends: readonly (Sum | Option)[] =
    choices.kind === 'between' ? [choices.from, choices.to] : choices.options;
  return hull(ends.map((end) => intervalOf(end, symbols, phase, depth)));
}

/** All the values that may hold, or the one of a phase. */
export function valuesIn<T>(value: ByPhase<T>, phase?: string): readonly T[] {
  if (phase === undefined)
    return [value.base, ...value.exceptions.map((exception) => exception.value)];
  const exception = value.exceptions.find(({ phases }) =>
    phases.some(({ name }) => name === phase),
  );
  return [exception ? exception.value : value.base];
}

/** Every spot that a name of a place, or of a draw among places, may stand for. */
export function spotsOf(
  name: string,
  symbols: Symbols,
  phase?: string,
  depth = 0,
): readonly Spot[] {
  const symbol = symbols.get(name);
  if (symbol?.kind === 'place') return valuesIn(symbol.decl.place, phase);
  if ((symbol?.kind !== 'draw' && symbol?.kind !== 'choice') || depth > DEEPEST_NAMES) return [];
  const { choices } = symbol.decl;
  if (choices.kind === 'between') return [];
  return choices.options.flatMap((option) =>
    option.kind === 'name' ? spotsOf(option.name, symbols, phase, depth + 1) : [],
  );
}

export function hull(intervals: readonly Interval[]): Interval {
  if (intervals.length === 0) return ANY;
  return {
    low: Math.min(...intervals.map(({ low }) => low)),
    high: Math.max(...intervals.map(({ high }) => high)),
  };
}
