import type { Moment, RuleDecl } from '../ast.js';
import { boundsOf } from './bounds.js';
import type { Builder } from './builder.js';
import { compileCondition } from './compileCondition.js';
import { compileSum, pointOf, spanOf } from './compileSum.js';
import type { Arming, LickWaiter, RuleSpec } from './program.js';

/** Who waits for what, filled while the rules are compiled. */
export interface Waiters {
  readonly licks: LickWaiter[];
  readonly rises: { input: number; rule: number }[];
  readonly falls: { input: number; rule: number }[];
  readonly lap: number[];
  readonly cell: number[];
  readonly session: number[];
  readonly phase: { phase: number; rule: number }[];
  readonly presses: Map<string, number[]>;
  /** By rule: who waits for it to fire. */
  readonly fires: number[][];
}

export function compileWhen(
  b: Builder,
  decl: RuleDecl,
  rule: number,
  waiters: Waiters,
): RuleSpec['when'] {
  const { when } = decl;
  switch (when.kind) {
    case 'after':
      wait(b, when.moment, rule, waiters);
      return { kind: 'after', delayUs: compileSum(b, when.delay) };
    case 'every':
      return { kind: 'every', intervalUs: compileSum(b, when.interval) };
    case 'every row': {
      const { rows } = b.names.need(when.table.name, 'table').decl;
      if (rows.kind === 'times') return { kind: 'times', timeUs: rows.timeUs };
      return { kind: 'places', lap: rows.lap, placeCm: rows.placeCm };
    }
    case 'becomes':
      return {
        kind: 'becomes',
        condition: compileCondition(b, when.condition),
        lastingUs: when.lasting ? compileSum(b, when.lasting) : undefined,
      };
    default:
      wait(b, when, rule, waiters);
      return { kind: 'moment' };
  }
}

/** Puts the rule on the list of its moment. */
function wait(b: Builder, moment: Moment, rule: number, waiters: Waiters): void {
  switch (moment.kind) {
    case 'reaches':
      b.points[pointOf(b, moment.place)]!.rules.push(rule);
      return;
    case 'enters':
    case 'leaves': {
      const span = b.spans[spanOf(b, moment.span)]!;
      span.tracked = true;
      span[moment.kind === 'enters' ? 'enterRules' : 'leaveRules'].push(rule);
      return;
    }
    case 'begins':
      if (typeof moment.what === 'string') waiters[moment.what].push(rule);
      else waiters.phase.push({ phase: b.names.need(moment.what.name, 'phase').index, rule });
      return;
    case 'fires':
      waiters.fires[b.names.need(moment.rule.name, 'rule').index]!.push(rule);
      return;
    case 'rises':
    case 'falls':
      waiters[moment.kind].push({ input: b.names.need(moment.input.name, 'input').index, rule });
      return;
    case 'presses': {
      const { name } = moment.button;
      waiters.presses.set(name, [...(waiters.presses.get(name) ?? []), rule]);
      return;
    }
    case 'lick':
      waiters.licks.push({ rule, span: moment.within ? spanOf(b, moment.within) : -1 });
      return;
    case 'nth lick': {
      const span = moment.within ? spanOf(b, moment.within) : -1;
      const { nth, stretch } = moment;
      const tally = b.tally('licks', span, stretch === 'visit' ? { visitOf: span } : {});
      waiters.licks.push({ rule, span, nth: { nth, tally, stretch } });
      return;
    }
    case 'bout': {
      const span = moment.within ? spanOf(b, moment.within) : -1;
      const most = Math.min(1_000, Math.max(1, Math.ceil(boundsOf(moment.count, b.names).most)));
      const bout = { count: compileSum(b, moment.count), timeUs: compileSum(b, moment.time), most };
      waiters.licks.push({ rule, span, bout });
      return;
    }
  }
}

/** The place that the board could wait for. */
export function armingOf(b: Builder, decl: RuleDecl): Arming | undefined {
  const { when } = decl;
  if (when.kind === 'reaches') return { kind: 'reaches', point: pointOf(b, when.place) };
  if (when.kind === 'enters' || when.kind === 'leaves') {
    return { kind: when.kind, span: spanOf(b, when.span) };
  }
  return undefined;
}
