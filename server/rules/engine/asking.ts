import type { ArmingPass } from './arming.js';
import type { Firing } from './firing.js';
import type { RuleState } from './ruleState.js';
import type { Run } from './run.js';

/** A slot that is let go is cleared by the next beat; one whose beat was lost by the one after. */
const CLEARED_US = 250_000;

/**
 * What the operator asks of rules beyond what the file says by itself. The rule's moment still
 * decides the place, and its limits, its `sham` and every guard hold; only `if` and `chance` are
 * taken as true.
 */
export class Asking {
  /** Rules to be fired at once. */
  private readonly now: RuleState[] = [];

  constructor(
    private readonly run: Run,
    private readonly firing: Firing,
    private readonly arming: ArmingPass,
  ) {}

  /** @returns false when the file does not let the rule be asked for so */
  ask(rule: string, laps: number): boolean {
    const { s } = this.run;
    const r = this.find(rule);
    if (r === undefined) return false;
    const { asked } = r.spec;
    if (laps === 0) {
      if (!asked?.now) return false;
      this.forget(r);
      r.askedUs = s.nowUs;
      this.now.push(r);
      return true;
    }
    const most = asked?.laps?.(s) ?? 0;
    if (!(Number.isInteger(laps) && laps >= 1 && laps <= most)) return false;
    this.forget(r);
    r.askedFrom = s.lap + 1;
    r.askedTo = s.lap + laps;
    return true;
  }

  /** @returns false when nothing was asked of it that is still to come */
  withdraw(rule: string): boolean {
    const r = this.find(rule);
    if (r === undefined || (Number.isNaN(r.askedUs) && r.askedTo < this.run.s.lap)) return false;
    this.forget(r);
    return true;
  }

  /** At each instant, before the rules have their turns. */
  step(): void {
    if (this.now.length === 0) return;
    const { s } = this.run;
    for (let n = this.now.length - 1; n >= 0; n--) {
      const r = this.now[n]!;
      // One slot and one pulse besides could be a firing too many: the slot has to be cleared first.
      if (r.wantedSerial > 0) this.arming.disarm(r);
      if (r.slots.length > 0 && s.nowUs - r.askedUs <= CLEARED_US) continue;
      this.now.splice(n, 1);
      if (r.slots.length > 0) {
        this.firing.missed(r, ++r.serial, 'the board did not clear its slot in time');
      } else {
        r.askedUs = s.nowUs;
        this.firing.ask(r, s.nowUs, Number.NaN, true);
      }
      r.askedUs = Number.NaN;
    }
  }

  private find(rule: string): RuleState | undefined {
    return this.run.s.rules.find(({ spec }) => spec.name === rule);
  }

  private forget(r: RuleState): void {
    r.askedTo = -1;
    r.askedUs = Number.NaN;
    const at = this.now.indexOf(r);
    if (at >= 0) this.now.splice(at, 1);
  }
}
