import type { Action, ActionBody, Asked, Cap, Moment, UntilThen, When } from './ast.js';
import { printCondition, printSpan, printSum } from './printSum.js';
import { ordinal } from './text/words.js';

/** Prints a `when`. */
export function printWhen(when: When): string {
  switch (when.kind) {
    case 'after':
      return `${printSum(when.delay)} after ${printMoment(when.moment)}`;
    case 'every':
      return `every ${printSum(when.interval)}`;
    case 'every row':
      return `every row of ${when.table.name}`;
    case 'becomes': {
      const lasting = when.lasting ? ` for ${printSum(when.lasting)}` : '';
      return printCondition(when.condition) + lasting;
    }
    default:
      return printMoment(when);
  }
}

export function printMoment(moment: Moment): string {
  switch (moment.kind) {
    case 'reaches':
      return `reaches ${printSum(moment.place)}`;
    case 'enters':
    case 'leaves':
      return `${moment.kind} ${printSpan(moment.span)}`;
    case 'begins':
      return `${typeof moment.what === 'string' ? moment.what : moment.what.name} begins`;
    case 'fires':
      return `${moment.rule.name} fires`;
    case 'rises':
    case 'falls':
      return `${moment.input.name} ${moment.kind}`;
    case 'lick':
      return `lick${inSpan(moment)}`;
    case 'nth lick':
      return `${ordinal(moment.nth)} lick${inSpan(moment)} this ${moment.stretch}`;
    case 'bout':
      return `${printSum(moment.count)} licks within ${printSum(moment.time)}${inSpan(moment)}`;
    case 'presses':
      return `operator presses ${moment.button.name}`;
  }
}

function inSpan({ within }: Extract<Moment, { kind: 'lick' | 'nth lick' | 'bout' }>): string {
  return within ? ` in ${printSpan(within)}` : '';
}

export function printAction({ delay, body }: Action): string {
  return `${delay ? `after ${printSum(delay)}, ` : ''}${printBody(body)}`;
}

function printBody(body: ActionBody): string {
  switch (body.kind) {
    case 'give':
      return `give ${printSum(body.volume)}${body.from ? ` from ${body.from.name}` : ''}`;
    case 'pulse': {
      const pulse = `pulse ${body.output.name} for ${printSum(body.width)}`;
      if (!body.train) return pulse;
      const train = `${pulse} at ${printSum(body.train.rate)}`;
      if (body.train.times) return `${train}, ${printSum(body.train.times)} times`;
      return train + printUntil(body.train.until!);
    }
    case 'hold':
      return `hold ${body.output.name}${printUntil(body.until)}`;
    case 'stop':
      return `stop ${body.output.name}`;
    case 'go to':
      return `go to ${body.phase === 'next phase' ? body.phase : body.phase.name}`;
    default:
      return body.kind;
  }
}

function printUntil(until: UntilThen): string {
  const holding = until.while ? ` while ${printCondition(until.while)}` : '';
  return `${holding}, up to ${printSum(until.upTo)}`;
}

export function printAsked({ now, laps }: Asked): string {
  const next = laps ? printSum(laps) : '';
  const later = next === '1' ? 'in the next lap' : `in the next ${next} laps`;
  return [...(now ? ['now'] : []), ...(laps ? [later] : [])].join(' or ');
}

export function printCap(cap: Cap): string {
  if (cap.kind === 'apart time') return `at least ${printSum(cap.time)} apart`;
  if (cap.kind === 'apart laps') {
    const laps = printSum(cap.laps);
    return `at least ${laps} ${laps === '1' ? 'lap' : 'laps'} apart`;
  }
  return `${printSum(cap.count)} per ${typeof cap.per === 'string' ? cap.per : printSum(cap.per)}`;
}
