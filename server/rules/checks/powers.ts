import type { Measure, Sum } from '../ast.js';
import { multiply, type Powers, powersOf } from './dimensions.js';
import type { Symbols } from './symbols.js';

/** Names that need each other would never end; the check for circles reports them. */
const DEEPEST_NAMES = 40;

/**
 * The units that an amount comes to, without judging them.
 * @returns undefined where a name is unknown, or no amount
 */
export function powersOfSum(sum: Sum, symbols: Symbols, depth = 0): Powers | undefined {
  switch (sum.kind) {
    case 'quantity':
      return powersOf(sum.dimension);
    case 'name':
      return depth > DEEPEST_NAMES ? undefined : powersOfName(sum.name, symbols, depth + 1);
    case 'edge':
      return powersOf('length');
    case 'negate':
      return powersOfSum(sum.of, symbols, depth);
    case 'binary': {
      const left = powersOfSum(sum.left, symbols, depth);
      if (sum.operator === '+' || sum.operator === '-') {
        return left ?? powersOfSum(sum.right, symbols, depth);
      }
      const right = powersOfSum(sum.right, symbols, depth);
      return left && right && multiply(left, right, sum.operator === '*' ? 1 : -1);
    }
    default:
      return powersOf(dimensionOfMeasure(sum));
  }
}

export function dimensionOfMeasure(
  measure: Measure,
): 'number' | 'length' | 'time' | 'speed' | 'volume' {
  if (measure.kind === 'since') return measure.unit === 'time' ? 'time' : 'number';
  if (measure.kind === 'firings') return 'number';
  if (measure.kind === 'predicted') return measure.what === 'asymmetry' ? 'number' : 'length';
  switch (measure.measure) {
    case 'position':
      return 'length';
    case 'speed':
    case 'mean speed':
      return 'speed';
    case 'time':
    case 'phase time':
    case 'lap time':
      return 'time';
    case 'water given':
      return 'volume';
    default:
      return 'number';
  }
}

function powersOfName(name: string, symbols: Symbols, depth: number): Powers | undefined {
  const symbol = symbols.get(name);
  switch (symbol?.kind) {
    case 'value':
      return powersOfSum(symbol.decl.value.base, symbols, depth);
    case 'place':
      return powersOf('length');
    case 'draw':
    case 'choice': {
      const { choices } = symbol.decl;
      if (choices.kind === 'between') return powersOfSum(choices.from, symbols, depth);
      const [first] = choices.options;
      if (first?.kind === 'quantity') return powersOf(first.dimension);
      const named = first && symbols.get(first.name);
      return named?.kind === 'place' || named?.kind === 'value'
        ? powersOfName(first!.kind === 'name' ? first!.name : '', symbols, depth)
        : undefined;
    }
    default:
      return undefined;
  }
}
