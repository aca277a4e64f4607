import type { Condition, Sum } from '../ast.js';
import { type Interval, intervalOf, spotsOf } from './interval.js';
import type { Symbols } from './symbols.js';

/** Branches of `or` looked into; beyond them a condition is taken to be possible. */
const MOST_BRANCHES = 64;
/** How far from the place it reached the animal may be seen in the next frame, cm. */
const CROSSING_SLACK_CM = 5;

/** What is known of the animal at the moment that the conditions are read. */
export interface Known {
  /** Where it is, when the moment is a place. */
  readonly positionCm?: Interval;
  /** Amounts that something else keeps from growing further, by `keyOf`. */
  readonly most?: ReadonlyMap<string, number>;
}

/** Can these conditions never be true together? Errs towards "they can". */
export function contradictory(
  conditions: readonly Condition[],
  symbols: Symbols,
  known: Known = {},
): boolean {
  const branches = branchesOf(conditions);
  return branches?.every((terms) => impossible(terms, symbols, known)) ?? false;
}

/** The same words ask for the same amount. */
export function keyOf(piece: unknown): string {
  return JSON.stringify(piece, (key, value) =>
    key === 'at' || key === 'written' ? undefined : value,
  );
}

/** All the ways to choose one term of each `or`; undefined when there are too many. */
function branchesOf(conditions: readonly Condition[]): Condition[][] | undefined {
  let branches: Condition[][] = [[]];
  for (const condition of conditions.flatMap(termsOf)) {
    if (condition.kind !== 'or') {
      for (const branch of branches) branch.push(condition);
      continue;
    }
    const choices = condition.terms.map((term) => branchesOf([term]));
    if (choices.includes(undefined)) return undefined;
    const flat = choices.flatMap((choice) => choice!);
    if (branches.length * flat.length > MOST_BRANCHES) return undefined;
    branches = branches.flatMap((branch) => flat.map((more) => [...branch, ...more]));
  }
  return branches;
}

/** The terms that must all be true. */
export function termsOf(condition: Condition): Condition[] {
  return condition.kind === 'and' ? condition.terms.flatMap(termsOf) : [condition];
}

function impossible(terms: readonly Condition[], symbols: Symbols, known: Known): boolean {
  const state = new Narrowing(symbols, known);
  return !terms.every((term) => state.add(term, false));
}

/** What the terms so far leave possible; `add` is false once nothing is. */
class Narrowing {
  private readonly ranges = new Map<string, { low: number; high: number; open: boolean }>();
  private readonly words = new Map<string, ReadonlySet<string>>();
  private readonly notWords = new Map<string, Set<string>>();
  private readonly flags = new Map<string, boolean>();

  constructor(
    private readonly symbols: Symbols,
    private readonly known: Known,
  ) {}

  add(term: Condition, negated: boolean): boolean {
    switch (term.kind) {
      case 'not':
        return this.add(term.of, !negated);
      case 'in':
        return this.flag(keyOf(term.span), !negated) && (negated || this.mayBeIn(term));
      case 'still':
        return this.flag('still', !negated);
      case 'learned':
        return this.flag(`learned ${keyOf(term.span)}`, !negated);
      case 'compare':
        return this.compare(term, negated);
      case 'is':
        return this.is(term, negated !== term.negated);
      case 'is range':
        return negated !== term.negated || this.isRange(term);
      default:
        return true;
    }
  }

  private flag(key: string, value: boolean): boolean {
    const before = this.flags.get(key);
    this.flags.set(key, value);
    return before === undefined || before === value;
  }

  private compare(
    { operator, left, right }: Condition & { kind: 'compare' },
    negated: boolean,
  ): boolean {
    const opposite = { '<': '>=', '<=': '>', '>': '<=', '>=': '<' } as const;
    const asked = negated ? opposite[operator] : operator;
    const below = asked === '<' || asked === '<=';
    const strict = asked === '<' || asked === '>';
    const [small, large] = below ? [left, right] : [right, left];
    const low = this.interval(small);
    const high = this.interval(large);
    if (low.low > high.high || (strict && low.low >= high.high && Number.isFinite(low.low)))
      return false;
    return (
      this.narrow(small, { low: -Infinity, high: high.high }, strict) &&
      this.narrow(large, { low: low.low, high: Infinity }, strict)
    );
  }

  private isRange({ subject, from, to }: Condition & { kind: 'is range' }): boolean {
    const low = this.interval(from).low;
    const high = this.interval(to).high;
    // A range of positions may go over the seam.
    if (low > high) return true;
    const now = this.interval(subject);
    return now.low <= high && now.high >= low && this.narrow(subject, { low, high }, false);
  }

  private is({ subject, options }: Condition & { kind: 'is' }, negated: boolean): boolean {
    const names = options.flatMap((option) => (option.kind === 'name' ? [option.name] : []));
    const key = keyOf(subject);
    if (names.length === options.length) return this.word(key, new Set(names), negated);
    if (negated || subject.kind === 'phase word' || names.length > 0) return true;
    const values = options.map((option) => this.interval(option));
    const low = Math.min(...values.map((value) => value.low));
    const high = Math.max(...values.map((value) => value.high));
    const now = this.interval(subject);
    return now.low <= high && now.high >= low && this.narrow(subject, { low, high }, false);
  }

  private word(key: string, names: ReadonlySet<string>, negated: boolean): boolean {
    if (negated) {
      const never = this.notWords.get(key) ?? new Set<string>();
      for (const name of names) never.add(name);
      this.notWords.set(key, never);
    } else {
      const before = this.words.get(key);
      this.words.set(key, before ? new Set([...names].filter((name) => before.has(name))) : names);
    }
    const allowed = this.words.get(key);
    const never = this.notWords.get(key);
    return !allowed || [...allowed].some((name) => !never?.has(name));
  }

  private narrow(subject: Sum, to: Interval, open: boolean): boolean {
    const key = keyOf(subject);
    const before = this.ranges.get(key) ?? { low: -Infinity, high: Infinity, open: false };
    const low = Math.max(before.low, to.low);
    const high = Math.min(before.high, to.high);
    this.ranges.set(key, { low, high, open: before.open || open });
    return low < high || (low === high && !(before.open || open));
  }

  private interval(sum: Sum): Interval {
    const found = intervalOf(sum, this.symbols);
    const most = this.known.most?.get(keyOf(sum));
    if (sum.kind === 'measure' && sum.measure === 'position' && this.known.positionCm) {
      return this.known.positionCm;
    }
    return most === undefined ? found : { low: found.low, high: Math.min(found.high, most) };
  }

  /** Could an animal that has just reached a known place be in this span? */
  private mayBeIn({ span }: Condition & { kind: 'in' }): boolean {
    const here = this.known.positionCm;
    if (!here) return true;
    const spots = span.kind === 'name' ? spotsOf(span.name, this.symbols) : [span];
    if (spots.length === 0) return true;
    return spots.some((spot) => {
      const from = intervalOf(spot.from, this.symbols);
      const to = intervalOf(spot.to ?? spot.from, this.symbols);
      // Over the seam, or not the same in every phase: taken to be possible.
      if (!(from.high <= to.low)) return true;
      return here.high >= from.low && here.low <= to.high;
    });
  }
}

/** Where the animal is when a place is reached. */
export function positionAt(place: Sum, symbols: Symbols): Known {
  const { low, high } = intervalOf(place, symbols);
  const length = symbols.file.beltLengthCm.value;
  // Near the seam the next frame may be on its other side.
  if (!(low >= CROSSING_SLACK_CM && high <= length - CROSSING_SLACK_CM)) return {};
  return { positionCm: { low: low - CROSSING_SLACK_CM, high: high + CROSSING_SLACK_CM } };
}
