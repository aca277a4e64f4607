import type { Settlement } from '../instant.js';
import type { Firing } from './firing.js';
import { limitsAllow } from './limits.js';
import { ordersNow, stillSo, trustLacking } from './orders.js';
import type { OutstandingSlot, RuleState } from './ruleState.js';
import type { Run } from './run.js';
import { TRUE } from './truth.js';

/** A place is armed this far ahead, or this long at the present speed, whichever is more. */
const HORIZON_CM = 30;
const HORIZON_S = 1.5;
/** After a slot was not to be had. */
const RETRY_US = 10_000;

function byTarget(a: RuleState, b: RuleState): number {
  return a.targetTravel - b.targetTravel;
}

/**
 * Rules that the board may start by itself: armed while their place lies ahead on this lap, going
 * forwards, and their `if`, limits and chance would let them fire. A crossing of an armed place is
 * not fired here; the board's word counts.
 */
export class ArmingPass {
  /** Nearest target first. */
  private readonly rules: RuleState[];
  /** The furthest target that is armed. */
  private furthestWanted = Number.NEGATIVE_INFINITY;

  constructor(
    private readonly run: Run,
    private readonly firing: Firing,
  ) {
    this.rules = run.s.rules.filter((r) => r.spec.arming !== undefined);
  }

  /** At the end of each frame; one comparison while every place is far. */
  step(): void {
    if (this.rules.length === 0) return;
    const { run } = this;
    const { s } = run;
    if (!s.placed) {
      if (run.targetsChanged) this.disarmAll();
      run.targetsChanged = false;
      return;
    }
    const speed = s.instant.speedCmPerS;
    const horizonCm = Math.max(speed * HORIZON_S, HORIZON_CM);
    const furthest = s.travel + horizonCm * s.countsPerCm;
    if (run.targetsChanged) {
      run.targetsChanged = false;
      for (const r of this.rules) r.targetTravel = this.target(r);
      this.rules.sort(byTarget);
      this.furthestWanted = Number.POSITIVE_INFINITY;
    }
    // What was armed when the animal was faster is looked at further ahead than what was not.
    const limit = Math.max(furthest, this.furthestWanted);
    this.furthestWanted = Number.NEGATIVE_INFINITY;
    for (let n = 0; n < this.rules.length; n++) {
      const r = this.rules[n]!;
      if (r.targetTravel > limit) break;
      this.look(r, furthest);
      if (r.wantedSerial > 0 && r.targetTravel > this.furthestWanted) {
        this.furthestWanted = r.targetTravel;
      }
    }
  }

  private target(r: RuleState): number {
    const { s } = this.run;
    const arming = r.spec.arming!;
    if (arming.kind === 'reaches') return s.points[arming.point]!.targetTravel;
    const ahead = s.spans[arming.span]!.aheadTravel(arming.kind === 'enters');
    return Number.isNaN(ahead) ? Number.POSITIVE_INFINITY : ahead;
  }

  private look(r: RuleState, furthest: number): void {
    const { run } = this;
    const { s } = run;
    const { spec } = r;
    const target = r.targetTravel;
    // Not across the seam, where the mark may yet correct the position.
    const ahead =
      target > s.travel &&
      (target <= furthest || r.wantedSerial > 0) &&
      Math.floor(target / s.lapCounts) === Math.floor(s.travel / s.lapCounts);
    if (ahead) {
      r.held = this.firing.ifHolds(r);
      r.heldFrame = run.frame;
    }
    const wanted =
      ahead &&
      r.held &&
      trustLacking(s, spec) === undefined &&
      (spec.sham === undefined || spec.sham(s) !== TRUE) &&
      limitsAllow(s, r) &&
      Number.isNaN(r.askedUs) &&
      (r.isAsked(s.lap) || this.firing.chanceComesUp(r));
    if (!wanted) {
      if (r.wantedSerial > 0) this.disarm(r);
      return;
    }
    if (r.wantedSerial > 0 && r.wantedTravel === target && this.shapeStands(r)) return;
    if (s.nowUs < r.retryUs) return;
    this.arm(r, target);
  }

  /** Whether what was armed is still what the rule would do. */
  private shapeStands(r: RuleState): boolean {
    const { version, s } = this.run;
    if (r.wantedVersion === version && !r.spec.amountsVary) return true;
    if (!stillSo(s, r.spec, r.wantedOrders)) return false;
    r.wantedVersion = version;
    return true;
  }

  private arm(r: RuleState, target: number): void {
    const { run } = this;
    const { s } = run;
    if (r.wantedSerial > 0) this.disarm(r);
    const serial = r.serial + 1;
    const orders = ordersNow(s, r.spec);
    const reason = run.actuator.arm({
      ...{ rule: r.spec.index, serial, causeUs: s.nowUs, expiryUs: Number.POSITIVE_INFINITY },
      ...{ placeTravel: target, withinCounts: this.firing.withinCounts(r), sham: false, orders },
      forwards: true,
    });
    if (reason !== undefined) {
      r.retryUs = s.nowUs + RETRY_US;
      return;
    }
    r.serial = serial;
    r.wantedSerial = serial;
    r.wantedTravel = target;
    r.wantedOrders = orders;
    r.wantedVersion = run.version;
    const crossedUs = Number.NaN;
    const byHand = r.isAsked(s.lap);
    r.slots.push({ serial, placeTravel: target, crossedUs, heldAtCrossing: false, byHand });
  }

  /** Lets the rule's slot go; what became of it is still told. */
  disarm(r: RuleState): void {
    r.wantedSerial = 0;
    this.run.actuator.disarm(r.spec.index);
  }

  /** The position was corrected: every slot stands for another count now. */
  disarmAll(): void {
    for (const r of this.rules) if (r.wantedSerial > 0) this.disarm(r);
  }

  /**
   * The animal is seen to cross the place of a rule that may be armed.
   * @returns true when the board decides about it; else the host has to
   */
  crossed(r: RuleState, causeUs: number, placeTravel: number): boolean {
    if (r.firedTravel === placeTravel) return true;
    let waiting = false;
    for (const slot of r.slots) {
      if (slot.placeTravel !== placeTravel) continue;
      slot.crossedUs = causeUs;
      slot.heldAtCrossing = this.heldBefore(r);
      waiting = true;
    }
    if (waiting) {
      // No disarming: the board has passed the place too, and its word is on the way.
      r.wantedSerial = 0;
    }
    return waiting;
  }

  /** `if` on the last frame before this one; as it is now when the place was not near then. */
  heldBefore(r: RuleState): boolean {
    if (r.heldFrame === this.run.frame - 1) return r.held;
    return this.firing.ifHolds(r);
  }

  /** @returns false when the serial is not that of a slot */
  settle(r: RuleState, serial: number, how: Settlement): boolean {
    const at = r.slots.findIndex((slot) => slot.serial === serial);
    if (at < 0) return false;
    const slot = r.slots[at]!;
    r.slots.splice(at, 1);
    if (r.wantedSerial === serial) r.wantedSerial = 0;
    if (how === 'not fired') this.notFired(r, slot);
    else this.fired(r, slot, how);
    return true;
  }

  private fired(r: RuleState, slot: OutstandingSlot, how: Settlement): void {
    r.firedTravel = slot.placeTravel;
    this.firing.count(r, slot.serial, { byHand: slot.byHand, announce: how === 'fired' });
    if (how !== 'fired') return;
    this.run.journal.fired(r.spec.index, slot.serial, false, true);
    this.firing.act(r, slot.serial, false);
  }

  private notFired(r: RuleState, slot: OutstandingSlot): void {
    const { crossedUs, placeTravel } = slot;
    if (Number.isNaN(crossedUs) || !slot.heldAtCrossing) return;
    if (r.firedTravel === placeTravel) return;
    // Another slot for the same place may have fired instead.
    if (r.slots.some((other) => other.placeTravel === placeTravel)) return;
    this.firing.ask(r, crossedUs, placeTravel, true);
  }
}
