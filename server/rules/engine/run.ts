import type { Actuator, Inquiry, Journal } from '../instant.js';
import { Plasticity } from './plasticity.js';
import type { DelayedAction, Held } from './ruleState.js';
import type { State } from './state.js';
import { TRUE } from './truth.js';

/** Where an asked-for change of phase leads, when it is not a phase's index. */
export const NOWHERE = -1;
export const NEXT = -2;
export const PREVIOUS = -3;
export const REPEAT = -4;

/** What the parts of the engine share while a session runs. */
export class Run {
  /** Some rule has a moment waiting in this instant. */
  anyDue = false;
  /** A phase, a draw or a choice changed: places and intervals are to be reckoned again. */
  valuesChanged = true;
  /** Grows whenever phases, draws or choices have changed. */
  version = 0;
  /** Some place ahead changed: what to arm is to be looked at again. */
  targetsChanged = true;
  /** Some draw is to be renewed because of a firing. */
  renewals = false;
  /** When the next timer of any kind is due. */
  nextTimerUs = Number.POSITIVE_INFINITY;
  readonly delayed: DelayedAction[] = [];
  readonly held: Held[] = [];
  /** Rules that fired, and the serials of those firings, for the rules that wait for them. */
  readonly firedRules: number[] = [];
  readonly firedSerials: number[] = [];
  /** A change of phase that is due at the next instant. */
  goTo = NOWHERE;
  goToReason = '';
  endReason = '';
  over = false;
  frame = 0;

  readonly plasticity: Plasticity;

  constructor(
    readonly s: State,
    readonly actuator: Actuator,
    readonly journal: Journal,
    readonly inquiry?: Inquiry,
  ) {
    this.plasticity = new Plasticity(this);
  }

  /** A moment for a rule: it is asked in its turn. */
  moment(rule: number, causeUs: number, placeTravel: number, serial = 0): void {
    const r = this.s.rules[rule]!;
    r.causes.push(causeUs);
    r.causePlaces.push(placeTravel);
    r.causeSerials.push(serial);
    this.anyDue = true;
  }

  moments(rules: readonly number[], causeUs: number, placeTravel: number): void {
    for (let n = 0; n < rules.length; n++) this.moment(rules[n]!, causeUs, placeTravel);
  }

  /** A place that a correction jumped over: missed, if its rule would have been asked. */
  jumpedOver(rule: number): void {
    const r = this.s.rules[rule]!;
    if (r.spec.if && r.spec.if(this.s) !== TRUE && !r.isAsked(this.s.lap)) return;
    r.missed++;
    this.journal.missed(rule, ++r.serial, 'a correction of the position jumped over the place');
  }

  touch(mark: number): void {
    const m = this.s.marks[mark]!;
    m.atUs = this.s.nowUs;
    m.lap = this.s.lap;
  }

  requestPhase(to: number, reason: string): void {
    this.goTo = to;
    this.goToReason = reason;
  }

  requestEnd(reason: string): void {
    if (this.endReason === '') this.endReason = reason;
  }
}
