import type { FiringRequest, Inquiry } from '../instant.js';
import { uniform } from './hash.js';
import { limitMet } from './limits.js';
import { orderOf, ordersNow, trustLacking } from './orders.js';
import type { ActionSpec } from './program.js';
import type { DelayedAction, PendingFiring, RuleState, UsedDraw } from './ruleState.js';
import { NEXT, type Run } from './run.js';
import { FALSE, TRUE } from './truth.js';

/** The longest after its moment that an output may start where the rule says nothing. */
export const DEFAULT_WITHIN_US = 50_000;
/**
 * The same where the rule says a distance. A distance alone would let an animal that stands still
 * beside the place be stimulated at any later time.
 */
export const DISTANCE_WITHIN_US = 250_000;
/** How a firing is counted. */
interface Counted {
  readonly sham?: boolean;
  readonly awaited?: boolean;
  /** Asked for by the operator, so that no chance was thrown. */
  readonly byHand: boolean;
  /** False: rules that wait for it do not hear of it. */
  readonly announce?: boolean;
}
/** Outcomes that are waited for at once, per rule; far more than a board keeps. */
const MOST_PENDING = 256;

/** Asks, counts and takes back firings. */
export class Firing {
  constructor(private readonly run: Run) {}

  /**
   * One moment of a rule, asked through the host.
   * @param placeTravel the place it is for, or NaN
   * @param ifHeld whether `if` is true for this moment
   */
  ask(r: RuleState, causeUs: number, placeTravel: number, ifHeld: boolean): void {
    const { run } = this;
    const { s } = run;
    const { spec } = r;
    if (run.over) return;
    if (!ifHeld) {
      if (run.inquiry !== undefined) this.tellFailed(r, run.inquiry);
      return;
    }
    const byHand = r.isAsked(s.lap) || r.askedUs === causeUs;
    if (!byHand && !this.chanceComesUp(r)) {
      r.chanceIndex++;
      run.inquiry?.chanceFailed(spec.index);
      return;
    }
    const met = limitMet(s, r);
    if (met >= 0) {
      run.inquiry?.limitMet(spec.index, met);
      // Whoever asked for it is waiting to see it.
      if (byHand && r.lastLap !== s.lap) this.withheld(r, ++r.serial, 'its limits leave no room');
      return;
    }
    const serial = ++r.serial;
    const expiryUs = causeUs + this.windowUs(r);
    const withinCounts = this.withinCounts(r);
    if (s.nowUs > expiryUs) {
      this.missed(r, serial, 'seen too long after its moment');
      return;
    }
    const off = s.travel - placeTravel;
    if (off > withinCounts || off < -withinCounts) {
      this.missed(r, serial, 'seen too far from its place');
      return;
    }
    const lacking = trustLacking(s, spec);
    if (lacking !== undefined) {
      this.withheld(r, serial, lacking);
      return;
    }
    const sham = spec.sham !== undefined && spec.sham(s) === TRUE;
    const orders = ordersNow(s, spec);
    if (orders.length === 0 && spec.actions.some(isOrderNow)) {
      this.missed(r, serial, 'its `while` was not true at the moment');
      return;
    }
    if (orders.length > 0) {
      const { index: rule } = spec;
      const request: FiringRequest = {
        ...{ rule, serial, causeUs, expiryUs, placeTravel, withinCounts, sham, orders },
      };
      const reason = run.actuator.fire(request);
      if (reason !== undefined) {
        this.withheld(r, serial, reason);
        return;
      }
    }
    const awaited = orders.length > 0 && !sham;
    this.count(r, serial, { sham, awaited, byHand });
    if (!awaited) run.journal.fired(spec.index, serial, sham, false);
    this.act(r, serial, sham);
  }

  private tellFailed(r: RuleState, inquiry: Inquiry): void {
    let untrue = 0;
    let unknown = 0;
    for (let n = 0; n < r.spec.ifTerms.length; n++) {
      const value = r.spec.ifTerms[n]!(this.run.s);
      if (value === FALSE) untrue |= 1 << n;
      else if (value !== TRUE) unknown |= 1 << n;
    }
    inquiry.ifFailed(r.spec.index, untrue, unknown);
  }

  /** What of a firing is not an order: stops, notes, phases, and whatever waits for a delay. */
  act(r: RuleState, serial: number, sham: boolean): void {
    const { run } = this;
    for (const action of r.spec.actions) {
      if (action.delayUs) {
        const dueUs = run.s.nowUs + Math.floor(action.delayUs(run.s) + 0.5);
        this.delay({ dueUs, rule: r.spec.index, serial, action, sham });
      } else if (action.kind === 'order') this.hold(action, r, serial, sham);
      else this.perform(action, r, serial, sham);
    }
  }

  private hold(
    action: ActionSpec & { kind: 'order' },
    r: RuleState,
    serial: number,
    sham: boolean,
  ): void {
    const { output, during } = action;
    if (!during || sham || during(this.run.s) !== TRUE) return;
    this.run.held.push({ output, rule: r.spec.index, serial, during });
  }

  private perform(action: ActionSpec, r: RuleState, serial: number, sham: boolean): void {
    const { run } = this;
    switch (action.kind) {
      case 'stop':
        if (!sham) run.actuator.stop(action.output);
        return;
      case 'note':
        run.journal.noted(r.spec.index, serial);
        return;
      case 'go to':
        run.requestPhase(action.phase, `rule ${r.spec.name}`);
        return;
      case 'next phase':
        run.requestPhase(NEXT, `rule ${r.spec.name}`);
        return;
      case 'end session':
        run.requestEnd(`rule ${r.spec.name}`);
        return;
      case 'order':
        return;
    }
  }

  private delay(action: DelayedAction): void {
    const { delayed } = this.run;
    let at = delayed.length;
    while (at > 0 && delayed[at - 1]!.dueUs > action.dueUs) at--;
    delayed.splice(at, 0, action);
    if (action.dueUs < this.run.nextTimerUs) this.run.nextTimerUs = action.dueUs;
  }

  /** Delayed actions whose time is up; each is guarded now. */
  delayedDue(): void {
    const { run } = this;
    while (run.delayed.length > 0 && run.delayed[0]!.dueUs <= run.s.nowUs) {
      const due = run.delayed.shift()!;
      const r = run.s.rules[due.rule]!;
      if (due.action.kind === 'order') this.delayedOrder(due, r, due.action);
      else this.perform(due.action, r, due.serial, due.sham);
    }
  }

  private delayedOrder(
    due: DelayedAction,
    r: RuleState,
    action: ActionSpec & { kind: 'order' },
  ): void {
    const { s } = this.run;
    const serial = ++r.serial;
    const expiryUs = due.dueUs + (r.spec.withinUs ? r.spec.withinUs(s) : DEFAULT_WITHIN_US);
    if (s.nowUs > expiryUs) {
      this.missed(r, serial, 'seen too long after its moment');
      return;
    }
    const lacking = trustLacking(s, r.spec);
    if (lacking !== undefined) {
      this.withheld(r, serial, lacking);
      return;
    }
    if (action.during && action.during(s) !== TRUE) {
      this.missed(r, serial, 'its `while` was not true at the moment');
      return;
    }
    const reason = this.run.actuator.fire({
      ...{ rule: r.spec.index, serial, causeUs: due.dueUs, expiryUs, placeTravel: Number.NaN },
      ...{ withinCounts: this.withinCounts(r), sham: due.sham, orders: [orderOf(s, action)] },
    });
    if (reason !== undefined) {
      this.withheld(r, serial, reason);
      return;
    }
    this.hold(action, r, serial, due.sham);
  }

  /** Whether the rule's `if` is true now, or taken as true since the operator asked for the rule. */
  ifHolds(r: RuleState): boolean {
    const { s } = this.run;
    return r.spec.if === undefined || r.isAsked(s.lap) || r.spec.if(s) === TRUE;
  }

  /** Whether the rule's chance would come up for its next firing. */
  chanceComesUp(r: RuleState): boolean {
    const { chance, name } = r.spec;
    if (chance === undefined) return true;
    if (r.chanceKnown !== r.chanceIndex) {
      r.chanceKnown = r.chanceIndex;
      r.chanceUp = uniform(this.run.s.seed, name, 'chance', r.chanceIndex, 0) < chance;
    }
    return r.chanceUp;
  }

  windowUs(r: RuleState): number {
    const { withinUs, withinCm } = r.spec;
    if (withinUs) return withinUs(this.run.s);
    return withinCm ? DISTANCE_WITHIN_US : DEFAULT_WITHIN_US;
  }

  /** How far from the place is right, in counts; without a distance said, half the belt. */
  withinCounts(r: RuleState): number {
    const { s } = this.run;
    if (!r.spec.withinCm) return Math.floor(s.lapCounts / 2);
    return Math.floor(r.spec.withinCm(s) * s.countsPerCm + 0.5);
  }

  missed(r: RuleState, serial: number, reason: string): void {
    r.missed++;
    this.run.journal.missed(r.spec.index, serial, reason);
  }

  private withheld(r: RuleState, serial: number, reason: string): void {
    r.withheld++;
    this.run.journal.withheld(r.spec.index, serial, reason);
  }

  /** Counts a firing at this instant; `awaited` when it may yet be taken back. */
  count(r: RuleState, serial: number, how: Counted): void {
    const { sham = false, awaited = false, byHand, announce = true } = how;
    const { run } = this;
    const { s } = run;
    const { spec } = r;
    const used: UsedDraw[] = [];
    for (const index of spec.firesDraws) {
      const draw = s.draws[index]!;
      used.push({ draw: index, index: draw.index, value: draw.value, option: draw.option });
      draw.renew = true;
      run.renewals = true;
    }
    if (awaited) {
      const at = s.stamp();
      const usedChance = spec.chance !== undefined && !byHand;
      r.pending.push({
        serial,
        at,
        sham,
        beforeUs: r.lastUs,
        beforeLap: r.lastLap,
        used,
        usedChance,
      });
      if (r.pending.length > MOST_PENDING) r.pending.shift();
    }
    if (spec.chance !== undefined && !byHand) r.chanceIndex++;
    if (spec.induces && !sham) run.plasticity.induced(spec.index, serial);
    s.tallies[sham ? spec.shamTally : spec.realTally]!.add(1, s.nowUs);
    r.lastUs = s.nowUs;
    r.lastLap = s.lap;
    if (!announce || spec.firesRules.length === 0) return;
    run.firedRules.push(spec.index);
    run.firedSerials.push(serial);
  }

  /** Nothing of that serial is held any more. */
  release(r: RuleState, serial: number): void {
    const { held } = this.run;
    for (let n = held.length - 1; n >= 0; n--) {
      if (held[n]!.rule === r.spec.index && held[n]!.serial === serial) held.splice(n, 1);
    }
  }

  /** The board did none of it: as if it had not been asked. */
  withdraw(r: RuleState, pending: PendingFiring): void {
    const { run } = this;
    const { s } = run;
    const tally = pending.sham ? r.spec.shamTally : r.spec.realTally;
    s.tallies[tally]!.withdraw(pending.at, s.stamp());
    if (pending.usedChance) r.chanceIndex--;
    run.plasticity.withdraw(r.spec.index, pending.serial);
    const later = r.pending.find((p) => p.beforeUs === pending.at.timeUs && p !== pending);
    if (later) {
      later.beforeUs = pending.beforeUs;
      later.beforeLap = pending.beforeLap;
    } else if (r.lastUs === pending.at.timeUs) {
      r.lastUs = pending.beforeUs;
      r.lastLap = pending.beforeLap;
    }
    for (const used of pending.used) {
      const draw = s.draws[used.draw]!;
      if (draw.index === used.index) draw.renew = false;
      else {
        draw.takeBack(used);
        run.valuesChanged = true;
      }
    }
    for (let n = run.delayed.length - 1; n >= 0; n--) {
      const { rule, serial } = run.delayed[n]!;
      if (rule === r.spec.index && serial === pending.serial) run.delayed.splice(n, 1);
    }
    this.release(r, pending.serial);
    for (const waiting of r.spec.firesRules) {
      const { timers, timerSerials } = s.rules[waiting]!;
      const at = timerSerials.indexOf(pending.serial);
      if (at < 0) continue;
      timers.splice(at, 1);
      timerSerials.splice(at, 1);
    }
    const announced = run.firedRules.findIndex(
      (rule, n) => rule === r.spec.index && run.firedSerials[n] === pending.serial,
    );
    if (announced < 0) return;
    run.firedRules.splice(announced, 1);
    run.firedSerials.splice(announced, 1);
  }
}

function isOrderNow(action: ActionSpec): boolean {
  return action.kind === 'order' && !action.delayUs;
}
