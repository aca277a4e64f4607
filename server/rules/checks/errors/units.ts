import type {
  Action,
  Cap,
  Choices,
  Condition,
  Dimension,
  Moment,
  RuleDecl,
  Scope,
  SpanExpr,
  Sum,
  UntilThen,
  When,
} from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { nameOf, type Powers, powersOf, samePowers } from '../dimensions.js';
import { powersOfSum } from '../powers.js';

/** Units that do not agree, through `+ - * /`, comparisons and every place that wants a kind. */
export const units: Check = (context) => {
  const check = new UnitCheck(context);
  const { file } = context;
  for (const { value } of file.values) {
    check.amount(value.base);
    for (const exception of value.exceptions) check.same(value.base, exception.value);
  }
  for (const { place } of file.places) {
    for (const spot of [place.base, ...place.exceptions.map(({ value }) => value)]) {
      check.needs(spot.from, 'length');
      if (spot.to) check.needs(spot.to, 'length');
    }
  }
  for (const { choices, step, first } of file.operator) {
    check.choices(choices);
    if (choices.kind === 'between' && step) check.same(choices.from, step);
    if (choices.kind === 'between' && first.kind === 'quantity') check.same(choices.from, first);
  }
  for (const { choices, habits } of file.draws) {
    check.choices(choices);
    for (const habit of habits) {
      const sum =
        habit.kind === 'apart' ? habit.least : habit.kind === 'steps' ? habit.of : undefined;
      const from = choices.kind === 'between' ? choices.from : choices.options[0]!;
      if (sum) check.same(from, sum);
    }
  }
  for (const { course } of file.phases) {
    if (course.kind === 'until') check.condition(course.condition);
    if (course.kind !== 'for') continue;
    for (const length of course.lengths) {
      if (length.kind === 'laps') check.needs(length.count, 'number');
      else check.needs(length.time, 'time');
    }
  }
  for (const rule of file.rules) check.rule(rule);
  if (file.end) check.condition(file.end);
};

const EXAMPLES: Readonly<Record<Dimension, string>> = {
  number: 'a plain number',
  length: 'a length such as `5 cm`',
  time: 'a time such as `2 s`',
  speed: 'a speed such as `5 cm/s`',
  volume: 'a volume such as `4 uL`',
  rate: 'a rate such as `20 Hz`',
};

class UnitCheck {
  constructor(private readonly context: CheckContext) {}

  /** Checks inside an amount; its units, or undefined when they cannot be told. */
  amount(sum: Sum): Powers | undefined {
    switch (sum.kind) {
      case 'negate':
        return this.amount(sum.of);
      case 'binary':
        if (sum.operator === '+' || sum.operator === '-') return this.same(sum.left, sum.right);
        this.amount(sum.left);
        this.amount(sum.right);
        break;
      case 'scoped':
        if (sum.within) this.span(sum.within);
        this.scope(sum.scope);
        break;
      case 'firings':
        this.scope(sum.scope);
        break;
      default:
    }
    return powersOfSum(sum, this.context.symbols);
  }

  /** Like is added to and compared with like. */
  same(left: Sum, right: Sum): Powers | undefined {
    const a = this.amount(left);
    const b = this.amount(right);
    if (!a || !b || samePowers(a, b)) return a ?? b;
    const bare = [left, right].find(
      (sum) => sum.kind === 'quantity' && /^[\d.]+$/.test(sum.written),
    );
    const other = bare === left ? b : a;
    if (bare) this.noUnit(bare, nameOf(other));
    else {
      this.context.problems.report('unitsDiffer', right.at, `${nameOf(b)} beside ${nameOf(a)}`, {
        expected: `${nameOf(a)}, like the other side`,
        also: [{ at: left.at, note: `this is ${nameOf(a)}` }],
      });
    }
    return undefined;
  }

  needs(sum: Sum, dimension: Dimension): void {
    const powers = this.amount(sum);
    if (!powers || samePowers(powers, powersOf(dimension))) return;
    if (sum.kind === 'quantity' && sum.dimension === 'number') {
      this.noUnit(sum, EXAMPLES[dimension]);
      return;
    }
    this.context.problems.report('unitsDiffer', sum.at, `${nameOf(powers)} where it cannot be`, {
      expected: EXAMPLES[dimension],
    });
  }

  private noUnit(sum: Sum, expected: string): void {
    const written = sum.kind === 'quantity' ? sum.written : '';
    this.context.problems.report('unitMissing', sum.at, `\`${written}\` has no unit`, { expected });
  }

  choices(choices: Choices): void {
    if (choices.kind === 'between') this.same(choices.from, choices.to);
  }

  span(span: SpanExpr): void {
    if (span.kind === 'name') return;
    this.needs(span.from, 'length');
    this.needs(span.to, 'length');
  }

  scope(scope: Scope): void {
    if (scope.kind === 'last laps') this.needs(scope.count, 'number');
    if (scope.kind === 'last time') this.needs(scope.time, 'time');
  }

  condition(condition: Condition): void {
    switch (condition.kind) {
      case 'and':
      case 'or':
        for (const term of condition.terms) this.condition(term);
        return;
      case 'not':
        this.condition(condition.of);
        return;
      case 'in':
      case 'learned':
        this.span(condition.span);
        return;
      case 'compare':
        this.same(condition.left, condition.right);
        return;
      case 'is range':
        this.same(condition.subject, condition.from);
        this.same(condition.subject, condition.to);
        return;
      case 'multiple':
        this.needs(condition.subject, 'number');
        this.needs(condition.of, 'number');
        return;
      case 'is':
        this.is(condition);
        return;
      default:
    }
  }

  private is({ subject, options }: Condition & { kind: 'is' }): void {
    if (subject.kind === 'phase word') return;
    for (const option of options) {
      if (option.kind === 'quantity' || this.context.symbols.get(option.name)?.kind === 'value') {
        this.same(subject, option);
      }
    }
    if (options.length === 0) this.amount(subject);
  }

  rule(rule: RuleDecl): void {
    this.when(rule.when);
    if (rule.if) this.condition(rule.if);
    if (rule.sham) this.condition(rule.sham);
    if (rule.chance) this.needs(rule.chance, 'number');
    for (const action of rule.do) this.action(action);
    for (const cap of rule.limits) this.cap(cap);
    if (rule.within) this.within(rule.within, rule);
    if (rule.asked?.laps) this.needs(rule.asked.laps, 'number');
  }

  private when(when: When): void {
    if (when.kind === 'after') {
      this.needs(when.delay, 'time');
      this.moment(when.moment);
    } else if (when.kind === 'every') this.needs(when.interval, 'time');
    else if (when.kind === 'becomes') {
      this.condition(when.condition);
      if (when.lasting) this.needs(when.lasting, 'time');
    } else if (when.kind !== 'every row') this.moment(when);
  }

  private moment(moment: Moment): void {
    if (moment.kind === 'reaches') this.needs(moment.place, 'length');
    if (moment.kind === 'enters' || moment.kind === 'leaves') this.span(moment.span);
    if (moment.kind === 'lick' || moment.kind === 'nth lick' || moment.kind === 'bout') {
      if (moment.within) this.span(moment.within);
    }
    if (moment.kind !== 'bout') return;
    this.needs(moment.count, 'number');
    this.needs(moment.time, 'time');
  }

  private action({ delay, body }: Action): void {
    if (delay) this.needs(delay, 'time');
    if (body.kind === 'give') this.needs(body.volume, 'volume');
    if (body.kind === 'hold') this.until(body.until);
    if (body.kind !== 'pulse') return;
    this.needs(body.width, 'time');
    if (!body.train) return;
    this.needs(body.train.rate, 'rate');
    if (body.train.times) this.needs(body.train.times, 'number');
    if (body.train.until) this.until(body.train.until);
  }

  private until(until: UntilThen): void {
    if (until.while) this.condition(until.while);
    this.needs(until.upTo, 'time');
  }

  private cap(cap: Cap): void {
    if (cap.kind === 'apart time') this.needs(cap.time, 'time');
    else if (cap.kind === 'apart laps') this.needs(cap.laps, 'number');
    else {
      this.needs(cap.count, 'number');
      if (typeof cap.per !== 'string') this.needs(cap.per, 'time');
    }
  }

  /** A distance is from a place, so the moment must have one. */
  private within(within: Sum, { when }: RuleDecl): void {
    const powers = this.amount(within);
    if (!powers || samePowers(powers, powersOf('time'))) return;
    const moment = when.kind === 'after' ? when.moment.kind : when.kind;
    if (['reaches', 'enters', 'leaves', 'every row'].includes(moment)) this.needs(within, 'length');
    else {
      this.context.problems.report(
        'unitsDiffer',
        within.at,
        'the moment of this rule has no place',
        {
          expected: 'a time such as `50 ms`',
          also: [{ at: when.at, note: 'the moment' }],
        },
      );
    }
  }
}
