import type { OutputFacts } from '../rules/facts.js';
import type { OutputOrder } from '../rules/instant.js';
import { OutputAccount } from './outputAccount.js';
import { Reservation } from './reservation.js';
import { WaterBook, type WaterLimits } from './waterBook.js';
import { volumeWords } from './words.js';

export interface GuardConfig {
  readonly outputs: readonly GuardedOutput[];
  readonly water: WaterLimits;
}
export interface GuardedOutput extends OutputFacts {
  /** Least belt distance between two firings of this output, which the board alone enforces. */
  readonly leastCounts?: number;
}

export type Holdable = 'stimulus' | 'water';

/** What the board is to enforce by itself for one output: the numbers of a `configure`. */
export interface Allowance {
  readonly output: number;
  readonly longestOnUs: number;
  readonly leastGapUs: number;
  readonly allowanceUs: number;
  readonly allowanceRises: number;
  readonly leastCounts: number;
}

/** `latestUs` of an order that waits in a slot. */
export const IN_SLOT = Number.POSITIVE_INFINITY;

const U16_MOST = 0xffff;
const U32_MOST = 0xffff_ffff;
/** A measured pulse runs over by the interrupt's latency: up to 15 us on an 8-bit board. */
const OVERRUN_US = 20;

/**
 * The host's guard over every output and all water, independent of the board's own.
 *
 * An id is charged in full from the moment it is asked or armed. The charge is given back only
 * when the board says that it did not fire, replaced by what the board measured when it did, and
 * stays for good when nobody can say.
 */
export class Guard {
  readonly #accounts: (OutputAccount | undefined)[] = [];
  readonly #water: WaterBook;
  readonly #config: GuardConfig;
  readonly #byId = new Map<number, Reservation>();
  readonly #held: Record<Holdable, string | undefined> = { stimulus: undefined, water: undefined };
  readonly #leftOut: number[] = [];
  readonly #scratch: Reservation[] = [];

  constructor(config: GuardConfig) {
    this.#config = config;
    this.#water = new WaterBook(config.water);
    for (const facts of config.outputs) this.#accounts[facts.index] = new OutputAccount(facts);
  }

  /** Water that the board reported given, nanolitres. */
  get waterGivenNl(): number {
    return this.#water.givenNl;
  }
  /** Water of drops never accounted for: given is between `waterGivenNl` and that plus this. */
  get waterUncertainNl(): number {
    return this.#water.uncertainNl;
  }
  get waterReservedNl(): number {
    return this.#water.reservedNl;
  }
  /** Left of the tighter of the session's and the day's limit. */
  get waterLeftNl(): number {
    return this.#water.leftNl;
  }
  /** Ids whose end is not known yet. */
  get unsettledIds(): Iterable<number> {
    return this.#byId.keys();
  }

  /**
   * Whether a firing's orders may be done, all of them together.
   *
   * @param nowUs extended board time
   * @param latestUs when a first rise may be at the latest; `IN_SLOT` for orders to be armed
   * @returns undefined when they may; else the reason, in words with numbers. Orders on marks
   *   never hold back the rest: those that cannot be done are in `leftOut` afterwards
   */
  check(orders: readonly OutputOrder[], nowUs: number, latestUs = nowUs): string | undefined {
    this.#leftOut.length = 0;
    let reason: string | undefined;
    let waterNl = 0;
    let asked = 0;
    for (; asked < orders.length; asked++) {
      const order = orders[asked]!;
      const account = this.#accounts[order.output];
      if (account === undefined) {
        reason = `output ${order.output}: not in the rig file`;
        break;
      }
      const volumeNl = volumeOf(account.facts, order);
      const one = this.#scratchAt(asked).set(-1, order, volumeNl, nowUs, latestUs);
      reason = this.#problem(account, order, one, nowUs, waterNl);
      if (reason === undefined) {
        // The firing's later orders are checked with the earlier ones in place.
        account.unsettled.push(one);
        waterNl += volumeNl;
        continue;
      }
      if (account.facts.kind !== 'mark') break;
      this.#leftOut.push(asked);
      reason = undefined;
    }
    for (let i = asked - 1; i >= 0; i--) {
      if (!this.#leftOut.includes(i)) this.#accounts[orders[i]!.output]!.unsettled.pop();
    }
    if (reason !== undefined) this.#leftOut.length = 0;
    return reason;
  }

  /** Which of the orders last checked are marks that cannot be done now; valid until the next check. */
  get leftOut(): readonly number[] {
    return this.#leftOut;
  }

  /** Charges an order in full under `id`, sham or real. @throws RangeError for an id or output that is taken or unknown */
  reserve(id: number, order: OutputOrder, nowUs: number, latestUs = nowUs): void {
    const account = this.#accounts[order.output];
    if (account === undefined) throw new RangeError(`output ${order.output} is not guarded`);
    if (this.#byId.has(id)) throw new RangeError(`id ${id} is reserved already`);
    const volumeNl = volumeOf(account.facts, order);
    const one = new Reservation().set(id, order, volumeNl, nowUs, latestUs);
    account.unsettled.push(one);
    this.#water.reservedNl += volumeNl;
    this.#byId.set(id, one);
  }

  /** The board reported the first rise of `id`. @returns false for an id that is not unsettled */
  fired(id: number, riseUs: number): boolean {
    const one = this.#byId.get(id);
    if (one === undefined) return false;
    one.firedUs = riseUs;
    return true;
  }

  /**
   * The end of an id that fired, or may have.
   *
   * - `done`: the board's measure; `onUs` on-time in all, last fall at `atUs`
   * - `sham`: nothing was sent; limits count it as if it had run as planned
   * - `uncertain`: unaccounted for; at `atUs` the board can no longer act on it
   * @returns false for an id that is not unsettled: nothing was changed
   */
  settle(id: number, how: 'done' | 'sham' | 'uncertain', onUs: number, atUs: number): boolean {
    const one = this.#take(id);
    if (one === undefined) return false;
    const account = this.#accounts[one.output]!;
    if (how === 'done') {
      const rises = account.done(one, onUs, atUs);
      this.#water.givenNl += measuredNl(account.facts, one, onUs, rises);
    } else if (how === 'sham') {
      account.sham(one);
      this.#water.shamNl += one.volumeNl;
    } else {
      account.uncertain(one, atUs);
      this.#water.uncertainNl += one.volumeNl;
    }
    return true;
  }

  /** The board reported that `id` never fired: its charge is given back. @returns as `settle` */
  release(id: number): boolean {
    return this.#take(id) !== undefined;
  }

  /** On-time that no id stands for, such as a valve flushed by hand: charged like any other. */
  charge(output: number, onUs: number, atUs: number): void {
    const account = this.#accounts[output];
    if (account === undefined) return;
    account.charge(onUs, atUs);
    const { valve } = account.facts;
    if (valve !== undefined) this.#water.givenNl += volumeFor(valve, onUs, 1);
  }

  /** Nothing of this kind is agreed to until `unhold`; a second reason replaces the first. */
  hold(what: Holdable, reason: string): void {
    this.#held[what] = reason;
  }
  unhold(what: Holdable): void {
    this.#held[what] = undefined;
  }
  heldBecause(what: Holdable): string | undefined {
    return this.#held[what];
  }

  /**
   * What each output's board guard is to be set to. What is still unsettled is left out of the
   * allowance, so ask once every id of the last connection has been settled.
   */
  allowances(): Allowance[] {
    return this.#config.outputs.map((facts) => {
      const account = this.#accounts[facts.index]!;
      let rises = account.risesLeft;
      let onUs = rises * (facts.longestOnUs + OVERRUN_US);
      const { valve } = facts;
      if (valve !== undefined) {
        const leftNl = this.#water.leftNl;
        rises = Math.min(rises, Math.floor(leftNl / Math.max(1, valve.leastNl)));
        const waterUs = Math.floor(leftNl * valve.usPerNl) + rises * (valve.deadUs + OVERRUN_US);
        onUs = Math.min(onUs, waterUs);
      }
      return {
        output: facts.index,
        longestOnUs: facts.longestOnUs,
        leastGapUs: facts.leastGapUs,
        allowanceUs: Math.min(U32_MOST, onUs),
        allowanceRises: Math.min(U16_MOST, rises),
        leastCounts: facts.leastCounts ?? 0,
      };
    });
  }

  #problem(
    account: OutputAccount,
    order: OutputOrder,
    one: Reservation,
    nowUs: number,
    waterNl: number,
  ): string | undefined {
    const { kind, name, valve } = account.facts;
    if (kind !== 'mark') {
      const what = kind === 'valve' ? 'water' : 'stimulus';
      const held = this.#held[what];
      if (held !== undefined) return `${name}: ${what} is held: ${held}`;
    }
    const reason = account.problem(one, nowUs);
    if (reason !== undefined || kind !== 'valve') return reason;
    const nl = order.volumeNl;
    if (valve !== undefined && nl > 0 && (nl < valve.leastNl || nl > valve.mostNl)) {
      const range = `${volumeWords(valve.leastNl)} to ${volumeWords(valve.mostNl)}`;
      return `${name}: ${volumeWords(nl)} asked, the valve was calibrated for ${range}`;
    }
    return this.#water.problem(one.volumeNl, waterNl, name);
  }

  #take(id: number): Reservation | undefined {
    const one = this.#byId.get(id);
    if (one === undefined) return undefined;
    this.#byId.delete(id);
    const { unsettled } = this.#accounts[one.output]!;
    unsettled.splice(unsettled.indexOf(one), 1);
    this.#water.reservedNl -= one.volumeNl;
    return one;
  }

  #scratchAt(index: number): Reservation {
    let one = this.#scratch[index];
    if (one === undefined) {
      one = new Reservation();
      this.#scratch[index] = one;
    }
    return one;
  }
}

type Valve = NonNullable<OutputFacts['valve']>;

/** What the valve gives in `onUs` over `rises` openings, by its calibrated line. */
function volumeFor(valve: Valve, onUs: number, rises: number): number {
  return Math.max(0, Math.round((onUs - rises * valve.deadUs) / valve.usPerNl));
}

/** The water in an order: what it asks for, or what its on-time would give, if that is more. */
function volumeOf(facts: OutputFacts, order: OutputOrder): number {
  if (facts.kind !== 'valve') return 0;
  const asked = order.volumeNl * order.repeats;
  if (facts.valve === undefined) return asked;
  return Math.max(asked, volumeFor(facts.valve, order.widthUs * order.repeats, order.repeats));
}

function measuredNl(facts: OutputFacts, one: Reservation, onUs: number, rises: number): number {
  if (facts.kind !== 'valve') return 0;
  if (facts.valve !== undefined) return volumeFor(facts.valve, onUs, rises);
  return Math.round((one.volumeNl * onUs) / one.onUs);
}
