// One file, since every way in which an id can end has to be seen beside the way it was charged.
import { type Guard, IN_SLOT } from '../../guard/guard.js';
import type {
  ArmRequest,
  FiringRequest,
  Instant,
  OutputOrder,
  Settlement,
  Withheld,
} from '../../rules/instant.js';
import type { Tracker } from '../../track/tracker.js';
import { type Identity, nameOf, OUTCOME, type Outcome, REASON } from '../../wire/messages.js';
import type { Decision } from '../decisions.js';
import type { RigOutput } from '../rig/rig.js';
import { Armory } from './armory.js';
import type { CoreOutput } from './coreOutput.js';
import { armOf, pulseOf } from './dispatch.js';
import { Ledger, type LiveFiring, type LiveId } from './ledger.js';

/** What the rest of the session core is to a firing. */
export interface FiringContext {
  readonly instant: Instant;
  readonly tracker: Tracker;
  readonly guard: Guard;
  readonly out: CoreOutput;
  readonly cmPerCount: number;
  readonly outputs: readonly (RigOutput | undefined)[];
  ruleName(rule: number): string;
  tell(decision: Decision): void;
  /** To the engine: how a firing went, a drop given, an output fallen. */
  settle(rule: number, serial: number, how: Settlement): void;
  drop(volumeNl: number): void;
  outputIdle(output: number): void;
  /** Every id of the last connection is accounted for: the board's allowances can be told. */
  accounted(): void;
}

/** Stands for a rule where a person tries an output between sessions. */
export const BY_HAND = -1;

/** An unanswered id is asked about again this long after its answer was due, and so many times. */
const ANSWER_US = 100_000;
const MOST_ASKED = 4;
const CHECK_EVERY_US = 50_000;
/** A mark that follows an armed firing is still right this long after its rise. */
const MARK_US = 50_000;

/**
 * From a rule's wish to the board's word on it: guards, sends, arms, and keeps every id until the
 * board has said what became of it.
 */
export class Firings {
  readonly #context: FiringContext;
  readonly #armory = new Armory();
  readonly #ledger = new Ledger();
  #linked = false;
  #checkDueUs = 0;
  /** Outcomes that the board still has to tell again after a handshake. */
  #keptToCome = 0;
  #overNetwork = false;

  constructor(context: FiringContext) {
    this.#context = context;
  }

  /** Every id sent so far is accounted for. */
  get settled(): boolean {
    return this.#ledger.size === 0;
  }
  get wantedMask(): number {
    return this.#armory.wantedMask;
  }
  /** The wanted mask has changed since this was last asked. */
  takeChanged(): boolean {
    const { changed } = this.#armory;
    this.#armory.changed = false;
    return changed;
  }
  isArmed(rule: number): boolean {
    return this.#armory.ofRule(rule) !== undefined;
  }
  /** Since when the rule's slot has stood, extended board time; NaN while it has none. */
  armedSinceUs(rule: number): number {
    return this.#armory.sinceUs(rule);
  }

  // ---- what rules ask ------------------------------------------------------------------------

  /** Guards all orders of a firing together and sends them to the board. */
  fire(request: FiringRequest): Withheld {
    return this.#start(request, false);
  }

  #start(request: FiringRequest, settled: boolean): Withheld {
    const { guard } = this.#context;
    const refusal = this.#refusal(request.orders, request.expiryUs);
    if (refusal !== undefined) return refusal;
    const leftOut = guard.leftOut.slice();
    const orders = request.orders.filter((_, index) => !leftOut.includes(index));
    if (orders.length === 0 && request.orders.length > 0) return 'its mark is busy';
    if (request.sham) {
      const { outputs } = this.#context;
      const masking = orders.filter((order) => outputs[order.output]?.masking);
      for (const order of orders) if (!masking.includes(order)) this.#sham(order);
      if (orders.length > 0) this.#tellSham(request);
      // What masks the stimulus runs whether there is one or not; it settles nothing.
      if (masking.length > 0) this.#pulse({ ...request, sham: false }, masking, true);
    } else if (orders.length > 0) this.#pulse(request, orders, settled);
    return undefined;
  }

  #pulse(request: FiringRequest, orders: readonly OutputOrder[], settled: boolean): void {
    const { tracker } = this.#context;
    const firing: LiveFiring = { request, armed: false, ids: [], settled };
    for (const order of orders) {
      const id = this.#ledger.takeId();
      this.#send({
        id,
        firing,
        order,
        command: { name: 'pulse', message: pulseOf(id, order, request, tracker) },
        latestUs: request.expiryUs + order.delayUs,
        risen: false,
        answerDueUs: request.expiryUs + order.delayUs + ANSWER_US,
        asked: 0,
      });
    }
    this.#tellSent('asked', firing);
  }

  /** Takes a slot of the board for a place ahead, unless the rule has it already. */
  arm(request: ArmRequest): Withheld {
    const { tracker } = this.#context;
    const held = this.#armory.ofRule(request.rule);
    if (held?.firing.request.serial === request.serial) return undefined;
    const order = mainOrder(request.orders, this.#context.outputs);
    if (order === undefined) return 'nothing in it can be armed';
    if (this.#armory.holds(request.rule)) return 'its last slot is still being cleared';
    const slot = this.#armory.free();
    if (slot < 0) return 'every slot of the board is taken';
    const refusal = this.#refusal(request.orders, IN_SLOT);
    if (refusal !== undefined) return refusal;
    const rising = tracker.countRises(request.forwards);
    const wanted = tracker.boardCountAt(request.placeTravel, request.forwards);
    const count = this.#armory.clearCount(wanted, rising ? 1 : -1);
    const id = this.#ledger.takeId();
    const firing: LiveFiring = { request, armed: true, ids: [], settled: false };
    const live: LiveId = {
      id,
      firing,
      order,
      command: { name: 'arm', message: armOf(id, slot, order, rising, count) },
      latestUs: IN_SLOT,
      risen: false,
      answerDueUs: Number.POSITIVE_INFINITY,
      asked: 0,
    };
    this.#armory.take(slot, live, request, count, this.#context.instant.nowUs);
    this.#send(live);
    this.#tellSent('armed', firing);
    return undefined;
  }

  /** The next beat leaves the rule's slot out. */
  disarm(rule: number, reason: string): void {
    const live = this.#armory.unwant(rule);
    if (live === undefined) return;
    live.answerDueUs = this.#context.instant.nowUs + ANSWER_US;
    const { request } = live.firing;
    this.#context.tell({
      kind: 'disarmed',
      rule: this.#context.ruleName(rule),
      serial: request.serial,
      reason,
    });
  }

  disarmAll(reason: string): void {
    for (const live of this.#ledger.all()) {
      if (live.firing.armed && !live.risen) this.disarm(live.firing.request.rule, reason);
    }
  }

  /** Disarms what would drive a stimulus, or give water. */
  disarmKind(water: boolean, reason: string): void {
    for (const live of this.#ledger.all()) {
      if (!live.firing.armed || live.risen) continue;
      const { kind } = this.#context.outputs[live.order.output] ?? {};
      if (kind !== 'mark' && (kind === 'valve') === water) {
        this.disarm(live.firing.request.rule, reason);
      }
    }
  }

  /** Ends what an output does now. */
  stop(output: number): void {
    this.#context.out.command('quiet', { outputs: 1 << output });
  }

  // ---- what the board says -------------------------------------------------------------------

  /** The board's word on an id. */
  outcome(m: Outcome): void {
    const atUs = this.#context.tracker.outcome(m);
    const live = this.#ledger.find(m.id);
    if (live !== undefined) this.#known(live, m, atUs);
    else this.#stray(m, atUs);
    // Outcomes repeated later than after a handshake answer a question of ours.
    if (m.repeated === 0 || this.#keptToCome === 0) return;
    this.#keptToCome--;
    if (this.#keptToCome === 0) this.#nothingMoreKept();
  }

  linkUp(identity: Identity, sameBoot: boolean, overNetwork: boolean): void {
    this.#linked = true;
    this.#overNetwork = overNetwork;
    this.#armory.reset(identity.slots);
    this.#keptToCome = identity.outcomesKept;
    if (!sameBoot) {
      // Outcomes that a board kept from before are of ids that this session never sent.
      this.#keptToCome = 0;
      this.#allUncertain('the board restarted before it said what became of it');
    }
    if (this.#keptToCome === 0) this.#nothingMoreKept();
  }

  linkDown(): void {
    this.#linked = false;
    this.#armory.unwantAll();
  }

  /** Asks again about what should have been answered; cheap while nothing is open. */
  check(nowUs: number): void {
    if (this.#ledger.size === 0 || nowUs < this.#checkDueUs || !this.#linked) return;
    this.#checkDueUs = nowUs + CHECK_EVERY_US;
    for (const live of this.#ledger.all()) {
      if (live.answerDueUs === Number.POSITIVE_INFINITY && this.#isBehind(live)) {
        live.answerDueUs = nowUs + ANSWER_US;
      }
      if (nowUs < live.answerDueUs) continue;
      if (live.asked >= MOST_ASKED) {
        this.#uncertain(live, 'the board never said what became of it');
        continue;
      }
      live.asked++;
      live.answerDueUs = nowUs + ANSWER_US;
      // The same id again: the board acts on it no second time and repeats its word.
      this.#context.out.command(live.command.name, live.command.message as never);
    }
  }

  /** What is open at the end of a session is not known, and stays charged. */
  abandon(): void {
    this.#allUncertain('the session ended before the board said what became of it');
  }

  /** The first id to send; above every one that the board may remember. */
  idsFrom(id: number): void {
    this.#ledger.idsFrom(id);
  }

  /** Leaves room for ids that a loop sent and could not record before it was killed. */
  skipIds(count: number): void {
    this.#ledger.skipIds(count);
  }

  // ---- within --------------------------------------------------------------------------------

  #refusal(orders: readonly OutputOrder[], latestUs: number): Withheld {
    if (!this.#linked) return 'the board is not connected';
    const { guard, instant, outputs } = this.#context;
    if (this.#overNetwork) {
      const real = orders.find((order) => outputs[order.output]?.kind === 'stimulus');
      if (real) return `${outputs[real.output]?.name}: no real stimulus over a network`;
    }
    return guard.check(orders, instant.nowUs, latestUs);
  }

  /** Charged as if real, under an id that nobody is sent. */
  #sham(order: OutputOrder): void {
    const { guard, instant } = this.#context;
    const id = this.#ledger.takeId();
    guard.reserve(id, order, instant.nowUs);
    guard.settle(id, 'sham', order.widthUs * order.repeats, instant.nowUs);
  }

  #tellSham({ rule, serial, placeTravel }: FiringRequest): void {
    const { tracker } = this.#context;
    this.#context.tell({
      ...{ kind: 'fired', rule: this.#context.ruleName(rule), serial, sham: true, armed: false },
      ...{ output: null, riseUs: null, riseCm: null, errorMm: null },
      placeCm: Number.isNaN(placeTravel) ? null : tracker.positionCmOf(placeTravel),
    });
  }

  #send(live: LiveId): void {
    const { guard, instant, out } = this.#context;
    guard.reserve(live.id, live.order, instant.nowUs, live.latestUs);
    this.#ledger.add(live);
    out.command(live.command.name, live.command.message as never);
  }

  #tellSent(kind: 'asked' | 'armed', { request, ids }: LiveFiring): void {
    const { tracker } = this.#context;
    this.#context.tell({
      kind,
      rule: this.#context.ruleName(request.rule),
      serial: request.serial,
      ids: ids.map((live) => live.id),
      placeCm: Number.isNaN(request.placeTravel) ? null : tracker.positionCmOf(request.placeTravel),
      expiryUs: kind === 'armed' ? null : request.expiryUs,
    });
  }

  #known(live: LiveId, m: Outcome, atUs: number): void {
    switch (m.kind) {
      case OUTCOME.fired:
        this.#rose(live, m, atUs);
        return;
      case OUTCOME.done:
        if (!live.risen) this.#rose(live, m, atUs - m.onUs);
        this.#fell(live, m, atUs);
        return;
      default:
        // The board no longer knows whether an earlier copy of this id acted.
        if (m.reason === REASON.oldId) this.#uncertain(live, 'the board had forgotten the id');
        else this.#unfired(live, m);
    }
  }

  #rose(live: LiveId, m: Outcome, riseUs: number): void {
    if (live.risen) return;
    live.risen = true;
    const { guard, tracker, outputs } = this.#context;
    guard.fired(live.id, riseUs);
    this.#armory.release(live);
    const { order, firing } = live;
    const { request } = firing;
    live.answerDueUs = riseUs + order.periodUs * (order.repeats - 1) + order.widthUs + ANSWER_US;
    live.asked = 0;
    const placed = !Number.isNaN(request.placeTravel);
    // A `done` that comes without its `fired` knows the fall's count only.
    const travel = m.kind === OUTCOME.fired ? tracker.travelAtCount(m.count) : Number.NaN;
    const known = !Number.isNaN(travel);
    this.#context.tell({
      kind: 'fired',
      rule: this.#context.ruleName(request.rule),
      serial: request.serial,
      sham: false,
      armed: firing.armed,
      output: outputs[order.output]?.name ?? null,
      riseUs,
      placeCm: placed ? tracker.positionCmOf(request.placeTravel) : null,
      riseCm: known ? tracker.positionCmOf(travel) : null,
      errorMm:
        placed && known ? (travel - request.placeTravel) * this.#context.cmPerCount * 10 : null,
    });
    if (firing.settled || outputs[order.output]?.kind === 'mark') return;
    this.#settle(firing, 'fired');
    if (firing.armed) this.#fireMarks(request, riseUs);
  }

  /** An armed firing's marks follow from the host, since the board starts one output by itself. */
  #fireMarks(request: FiringRequest, riseUs: number): void {
    const { outputs } = this.#context;
    const marks = request.orders.filter((order) => outputs[order.output]?.kind === 'mark');
    if (marks.length === 0) return;
    const expiryUs = riseUs + MARK_US;
    const placeTravel = Number.NaN;
    this.#start({ ...request, causeUs: riseUs, expiryUs, placeTravel, orders: marks }, true);
  }

  #fell(live: LiveId, m: Outcome, atUs: number): void {
    const { guard, outputs } = this.#context;
    const output = outputs[live.order.output];
    const before = guard.waterGivenNl;
    guard.settle(live.id, 'done', m.onUs, atUs);
    const volumeNl = guard.waterGivenNl - before;
    this.#close(live, true);
    this.#context.tell({
      kind: 'pulse done',
      rule: this.#context.ruleName(live.firing.request.rule),
      output: output?.name ?? String(live.order.output),
      onUs: m.onUs,
      volumeNl,
      reason: nameOf(REASON, m.reason),
    });
    if (volumeNl > 0) this.#context.drop(volumeNl);
    this.#context.outputIdle(live.order.output);
    this.#settleIfOver(live.firing, 'fired');
  }

  #unfired(live: LiveId, m: Outcome): void {
    const { guard, outputs } = this.#context;
    guard.release(live.id);
    this.#close(live, false);
    const { request, armed } = live.firing;
    const why = `${nameOf(OUTCOME, m.kind)}: ${nameOf(REASON, m.reason)}`;
    const wentBy = m.kind === OUTCOME.expired || m.kind === OUTCOME.passed;
    if (m.kind !== OUTCOME.disarmed && !(armed && wentBy)) {
      this.#context.tell({
        kind: wentBy ? 'missed' : 'refused',
        rule: this.#context.ruleName(request.rule),
        serial: request.serial,
        reason: `${outputs[live.order.output]?.name}: ${why}`,
      });
    }
    this.#context.outputIdle(live.order.output);
    this.#settleIfOver(live.firing, 'not fired');
  }

  #uncertain(live: LiveId, reason: string): void {
    const { guard, instant } = this.#context;
    guard.settle(live.id, 'uncertain', 0, instant.nowUs);
    this.#close(live, true);
    const { request } = live.firing;
    this.#context.tell({
      kind: 'uncertain',
      rule: this.#context.ruleName(request.rule),
      serial: request.serial,
      reason,
    });
    this.#context.outputIdle(live.order.output);
    this.#settleIfOver(live.firing, 'uncertain');
  }

  #allUncertain(reason: string): void {
    for (const live of [...this.#ledger.all()]) this.#uncertain(live, reason);
  }

  /**
   * The board has told all that it kept: an id that it has not named never reached it, and cannot
   * act any more, since its tag has ended. A pulse that rose will still report its fall.
   */
  #nothingMoreKept(): void {
    for (const live of [...this.#ledger.all()]) {
      if (live.risen) continue;
      this.#context.guard.release(live.id);
      this.#close(live, false);
      this.#context.outputIdle(live.order.output);
      this.#settleIfOver(live.firing, 'not fired');
    }
    this.#context.accounted();
  }

  /**
   * On-time under an id that stands for nothing here: sent and not recorded by a loop that was
   * killed, or given back too soon. It was driven, so it is charged.
   */
  #stray(m: Outcome, atUs: number): void {
    const { guard, outputs } = this.#context;
    const output = outputs[m.output];
    if (m.kind !== OUTCOME.done || output === undefined || this.#ledger.isCharged(m.id)) return;
    this.#ledger.closed(m.id, true);
    const before = guard.waterGivenNl;
    guard.charge(m.output, m.onUs, atUs);
    const volumeNl = guard.waterGivenNl - before;
    if (volumeNl > 0) this.#context.drop(volumeNl);
    this.#context.tell({
      kind: 'pulse done',
      rule: null,
      output: output.name,
      onUs: m.onUs,
      volumeNl,
      reason: 'nothing here was waiting for it',
    });
  }

  #close(live: LiveId, charged: boolean): void {
    this.#armory.release(live);
    this.#ledger.close(live, charged);
  }

  #settleIfOver(firing: LiveFiring, how: Settlement): void {
    const open = firing.ids.some(
      (live) => this.#context.outputs[live.order.output]?.kind !== 'mark',
    );
    if (!open && !firing.settled) this.#settle(firing, how);
  }

  #settle(firing: LiveFiring, how: Settlement): void {
    firing.settled = true;
    const { request } = firing;
    this.#context.settle(request.rule, request.serial, how);
  }

  #isBehind(live: LiveId): boolean {
    const { instant } = this.#context;
    const { placeTravel, withinCounts } = live.firing.request;
    return (
      Math.abs(instant.travelTo - placeTravel) > withinCounts && instant.travelTo > placeTravel
    );
  }
}

/** The one order that the board may start by itself: the first that is no mark. */
function mainOrder(
  orders: readonly OutputOrder[],
  outputs: readonly (RigOutput | undefined)[],
): OutputOrder | undefined {
  return orders.find((order) => outputs[order.output]?.kind !== 'mark') ?? orders[0];
}
