import type { ArmingPass } from './arming.js';
import type { Firing } from './firing.js';
import type { RuleState } from './ruleState.js';
import type { Run } from './run.js';
import { TRUE } from './truth.js';

/** Rules that fire each other with no time between are refused by the checker; this is a stop. */
const MOST_ROUNDS = 1_000;

/** The rules' turns at an instant: those that are due, in the order of the file. */
export class Turns {
  private readonly conditionRules: RuleState[];
  private readonly everyRules: RuleState[];

  constructor(
    private readonly run: Run,
    private readonly firing: Firing,
    private readonly arming: ArmingPass,
  ) {
    const { rules, startUs } = run.s;
    this.conditionRules = rules.filter((r) => r.spec.when.kind === 'becomes');
    this.everyRules = rules.filter((r) => r.spec.when.kind === 'every');
    for (const r of rules) {
      r.everyFromUs = startUs;
      if (r.spec.when.kind === 'times') this.aimAtRow(r, r.spec.when.timeUs);
    }
  }

  /** Intervals may have changed. */
  resetTimers(): void {
    for (const r of this.everyRules) this.aimAtInterval(r);
    this.findNextTimer();
  }

  take(): void {
    const { run } = this;
    const { s } = run;
    const timerDue = s.nowUs >= run.nextTimerUs;
    if (run.anyDue || timerDue) {
      if (run.delayed.length > 0) this.firing.delayedDue();
      run.anyDue = false;
      for (let n = 0; n < s.rules.length; n++) this.turn(s.rules[n]!, true);
      if (timerDue) this.findNextTimer();
    } else {
      for (let n = 0; n < this.conditionRules.length; n++) this.becomes(this.conditionRules[n]!);
    }
    for (let round = 0; run.firedRules.length > 0 && round < MOST_ROUNDS; round++) this.followUps();
  }

  /** A firing is a moment itself, taken after the rules that were due. */
  private followUps(): void {
    const { run } = this;
    const { s } = run;
    for (let n = 0; n < run.firedRules.length; n++) {
      const serial = run.firedSerials[n]!;
      for (const rule of s.rules[run.firedRules[n]!]!.spec.firesRules) {
        run.moment(rule, s.nowUs, Number.NaN, serial);
      }
    }
    run.firedRules.length = 0;
    run.firedSerials.length = 0;
    run.anyDue = false;
    for (let n = 0; n < s.rules.length; n++) {
      if (s.rules[n]!.causes.length > 0) this.turn(s.rules[n]!, false);
    }
  }

  private turn(r: RuleState, firstRound: boolean): void {
    switch (r.spec.when.kind) {
      case 'moment':
      case 'places':
        this.asked(r);
        return;
      case 'after':
        this.after(r, r.spec.when.delayUs);
        return;
      case 'every':
        if (firstRound) this.every(r);
        return;
      case 'times':
        if (firstRound) this.rows(r, r.spec.when.timeUs);
        return;
      case 'becomes':
        if (firstRound) this.becomes(r);
        return;
    }
  }

  private asked(r: RuleState): void {
    const { causes, causePlaces, causeSerials } = r;
    for (let n = 0; n < causes.length; n++) {
      const causeUs = causes[n]!;
      const place = causePlaces[n]!;
      if (r.spec.arming === undefined) this.ask(r, causeUs, place);
      else if (!this.arming.crossed(r, causeUs, place)) {
        this.firing.ask(r, causeUs, place, this.arming.heldBefore(r));
      }
    }
    causes.length = 0;
    causePlaces.length = 0;
    causeSerials.length = 0;
  }

  private ask(r: RuleState, causeUs: number, place: number): void {
    this.firing.ask(r, causeUs, place, this.firing.ifHolds(r));
  }

  private after(r: RuleState, delayUs: (s: Run['s']) => number): void {
    const { s } = this.run;
    for (let n = 0; n < r.causes.length; n++) {
      const dueUs = s.nowUs + Math.floor(delayUs(s) + 0.5);
      // A delay that is unknown now never runs out.
      if (!Number.isNaN(dueUs)) this.addTimer(r, dueUs, r.causeSerials[n]!);
    }
    r.causes.length = 0;
    r.causePlaces.length = 0;
    r.causeSerials.length = 0;
    while (r.timers.length > 0 && r.timers[0]! <= s.nowUs) {
      const dueUs = r.timers.shift()!;
      r.timerSerials.shift();
      this.ask(r, dueUs, Number.NaN);
    }
  }

  private addTimer(r: RuleState, dueUs: number, serial: number): void {
    let at = r.timers.length;
    while (at > 0 && r.timers[at - 1]! > dueUs) at--;
    r.timers.splice(at, 0, dueUs);
    r.timerSerials.splice(at, 0, serial);
    if (dueUs < this.run.nextTimerUs) this.run.nextTimerUs = dueUs;
  }

  private every(r: RuleState): void {
    const { s } = this.run;
    while (r.nextUs <= s.nowUs) {
      const dueUs = r.nextUs;
      r.everyFromUs = dueUs;
      this.aimAtInterval(r);
      this.ask(r, dueUs, Number.NaN);
    }
  }

  private aimAtInterval(r: RuleState): void {
    const { when } = r.spec;
    if (when.kind !== 'every') return;
    const interval = Math.floor(when.intervalUs(this.run.s) + 0.5);
    // Unknown, or none at all: it waits until a draw or a phase says otherwise.
    r.nextUs = interval > 0 ? r.everyFromUs + interval : Number.POSITIVE_INFINITY;
  }

  private rows(r: RuleState, timeUs: readonly number[]): void {
    while (r.nextUs <= this.run.s.nowUs) {
      const dueUs = r.nextUs;
      r.timeRow++;
      this.aimAtRow(r, timeUs);
      this.ask(r, dueUs, Number.NaN);
    }
  }

  private aimAtRow(r: RuleState, timeUs: readonly number[]): void {
    const row = timeUs[r.timeRow];
    r.nextUs = row === undefined ? Number.POSITIVE_INFINITY : this.run.s.startUs + row;
  }

  /** A condition as moment: it becomes true, or has been true for so long without a break. */
  private becomes(r: RuleState): void {
    const { when } = r.spec;
    if (when.kind !== 'becomes') return;
    const { s } = this.run;
    if (when.condition(s) !== TRUE) {
      r.wasTrue = false;
      return;
    }
    if (!r.wasTrue) {
      r.wasTrue = true;
      r.trueSinceUs = s.nowUs;
      r.lastingDone = false;
    }
    if (r.lastingDone) return;
    const lastingUs = when.lastingUs ? when.lastingUs(s) : 0;
    if (!(s.nowUs - r.trueSinceUs >= lastingUs)) return;
    r.lastingDone = true;
    this.ask(r, r.trueSinceUs + lastingUs, Number.NaN);
  }

  private findNextTimer(): void {
    const { run } = this;
    let next = run.delayed.length > 0 ? run.delayed[0]!.dueUs : Number.POSITIVE_INFINITY;
    for (const r of run.s.rules) {
      if (r.nextUs < next) next = r.nextUs;
      if (r.timers.length > 0 && r.timers[0]! < next) next = r.timers[0]!;
    }
    run.nextTimerUs = next;
  }
}
