import type { Condition, PhaseLength, Sum } from '../ast.js';
import { printSum } from '../printSum.js';
import type { Builder } from './builder.js';
import { compileCondition } from './compileCondition.js';
import { compileSum } from './compileSum.js';
import type { Ahead, Amount, GapSpec } from './program.js';

/** A condition as what is still lacking to it, so that its coming true can be foreseen. */
export function compileAhead(b: Builder, condition: Condition): Ahead {
  switch (condition.kind) {
    case 'and':
    case 'or':
      return {
        kind: condition.kind === 'and' ? 'all' : 'any',
        of: condition.terms.map((term) => compileAhead(b, term)),
      };
    case 'compare': {
      const { operator, left, right } = condition;
      const grows = operator === '>=' || operator === '>';
      return gap(b, grows ? left : right, grows ? right : left, operator.length === 1);
    }
    default:
      return { kind: 'test', test: compileCondition(b, condition) };
  }
}

/** The lengths of a phase, of which any one ends it. */
export function lengthAhead(b: Builder, lengths: readonly PhaseLength[]): Ahead {
  const of = lengths.map((length): Ahead => {
    const laps = length.kind === 'laps';
    const goal = compileSum(b, laps ? length.count : length.time);
    const done: Amount = laps ? (s) => s.phaseLap() : (s) => s.nowUs - s.phaseUs;
    return add(b, {
      lacking: (s) => goal(s) - done(s) + (laps ? 1 : 0),
      unit: laps ? 'laps' : 'time',
      done,
      goal,
      dimension: laps ? 'number' : 'time',
      what: laps ? 'laps of this phase' : 'phase time',
    });
  });
  return of.length === 1 ? of[0]! : { kind: 'any', of };
}

/** `low` has to come up to `high`, or beyond it where `strictly`. */
function gap(b: Builder, low: Sum, high: Sum, strictly: boolean): Ahead {
  const done = compileSum(b, low);
  const goal = compileSum(b, high);
  const dimension = b.names.dimensionOf(low);
  // Beyond a whole number is the next one.
  const more = strictly && dimension === 'number' ? 1 : 0;
  return add(b, {
    lacking: (s) => goal(s) - done(s) + more,
    unit: unitOf(low),
    done,
    goal,
    dimension,
    what: printSum(low),
  });
}

function unitOf(sum: Sum): GapSpec['unit'] {
  if (sum.kind === 'measure') {
    if (sum.measure === 'lap' || sum.measure === 'phase lap') return 'laps';
    if (sum.measure === 'time' || sum.measure === 'phase time') return 'time';
  }
  const laps = sum.kind === 'scoped' && sum.measure === 'laps done' && sum.scope.kind === 'this';
  return laps ? 'laps' : 'other';
}

function add(b: Builder, spec: GapSpec): Ahead {
  return { kind: 'gap', gap: b.gaps.push(spec) - 1 };
}
