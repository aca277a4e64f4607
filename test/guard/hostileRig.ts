import { Guard, type GuardConfig, IN_SLOT } from '../../server/guard/guard.js';
import type { OutputOrder } from '../../server/rules/instant.js';
import { dice } from '../track/beltModel.js';
import { LASER, pulse, VALVE } from './orders.js';

/** What really happened at an output, known to the test and not to the guard. */
interface Rise {
  readonly output: number;
  readonly startUs: number;
  readonly onUs: number;
}

/** An id sent to the board, and what the board will do and say. */
interface Sent {
  readonly id: number;
  readonly order: OutputOrder;
  readonly armed: boolean;
  startUs: number;
  /** Share of the order that runs before it is cut; 1 is all. */
  readonly share: number;
  readonly lost: boolean;
  /** -1 while it has not begun; NaN when it will not fire. */
  fellUs: number;
  onUs: number;
  tellUs: number;
  toldFired: boolean;
}

const DEAD_US = 500;
const US_PER_NL = 5;

/**
 * Random firings through a guard with tight limits, onto a board that starts late, cuts short,
 * refuses, and loses its answers; and a slow observer that keeps every rise and adds up naively.
 */
export class HostileRig {
  readonly guard: Guard;
  readonly config: GuardConfig;
  agreed = 0;
  withheld = 0;
  readonly #roll: () => number;
  readonly #arms: boolean;
  readonly #rises: Rise[] = [];
  /** Ids nobody can account for; water of shams and of such ids is charged in full. */
  readonly #lost: Sent[] = [];
  #chargedNl = 0;
  #givenNl = 0;
  #uncertainNl = 0;
  #reservedNl = 0;
  #sent: Sent[] = [];
  #nowUs = 0;
  #lastId = 0;
  /** When each output of the board is free of all it has begun. */
  readonly #busyUntilUs = [-1e12, -1e12];

  constructor(roll: () => number) {
    this.#roll = roll;
    this.#arms = roll() < 0.5;
    this.config = {
      outputs: [
        {
          name: 'valve',
          index: VALVE,
          kind: 'valve',
          longestOnUs: 20_000,
          leastGapUs: this.#upTo(30_000),
          valve: { deadUs: DEAD_US, usPerNl: US_PER_NL, leastNl: 100, mostNl: 4000 },
        },
        {
          name: 'laser',
          index: LASER,
          kind: 'stimulus',
          longestOnUs: 1000 + this.#upTo(50_000),
          leastGapUs: this.#upTo(20_000),
          perSession: 1 + this.#upTo(12),
          duty: { share: 0.05 + 0.3 * roll(), windowUs: 50_000 + this.#upTo(400_000) },
        },
      ],
      water: {
        perSessionNl: this.#upTo(15_000),
        perDayNl: 10_000,
        mostDropNl: 500 + this.#upTo(3000),
        givenTodayNl: this.#upTo(4000),
      },
    };
    this.guard = new Guard(this.config);
  }

  #upTo(most: number): number {
    return Math.floor(this.#roll() * (most + 1));
  }

  /** One command: a firing of one or two orders, asked, armed or sham. */
  command(): void {
    this.#advance(this.#nowUs + this.#upTo(this.#roll() < 0.3 ? 200_000 : 30_000));
    const orders = [this.#order()];
    if (this.#roll() < 0.3) orders.push(this.#order());
    const armed = this.#arms && this.#roll() < 0.4;
    const nowUs = this.#nowUs;
    const latestUs = armed ? IN_SLOT : nowUs + this.#upTo(40_000);
    if (this.guard.check(orders, nowUs, latestUs) !== undefined) {
      this.withheld++;
      return;
    }
    this.agreed++;
    const sham = !armed && this.#roll() < 0.1;
    for (const order of orders) {
      const id = ++this.#lastId;
      this.guard.reserve(id, order, nowUs, latestUs);
      if (sham) this.#sham(id, order, nowUs);
      else this.#send(id, order, nowUs, latestUs);
    }
  }

  #order(): OutputOrder {
    const delayUs = this.#roll() < 0.1 ? this.#upTo(60_000) : 0;
    if (this.#roll() < 0.5) {
      const volumeNl = 100 + this.#upTo(3600);
      return pulse(VALVE, DEAD_US + US_PER_NL * volumeNl, { volumeNl, delayUs });
    }
    const widthUs = 1 + this.#upTo(40_000);
    if (this.#roll() < 0.6) return pulse(LASER, widthUs, { delayUs });
    const periodUs = widthUs + 1 + this.#upTo(30_000);
    return pulse(LASER, widthUs, { delayUs, periodUs, repeats: 2 + this.#upTo(4) });
  }

  #sham(id: number, order: OutputOrder, nowUs: number): void {
    this.guard.settle(id, 'sham', 0, nowUs);
    this.#chargedNl += order.volumeNl;
    this.#run(order, nowUs + order.delayUs, 1);
  }

  #send(id: number, order: OutputOrder, nowUs: number, latestUs: number): void {
    const earliestUs = nowUs + order.delayUs;
    const spreadUs = latestUs === IN_SLOT ? 300_000 : Math.max(0, latestUs - earliestUs);
    this.#reservedNl += order.volumeNl;
    this.#sent.push({
      id,
      order,
      armed: latestUs === IN_SLOT,
      startUs: this.#roll() < 0.15 ? Number.NaN : earliestUs + this.#upTo(spreadUs),
      share: this.#roll() < 0.2 ? this.#roll() : 1,
      lost: this.#roll() < 0.1,
      fellUs: -1,
      onUs: 0,
      tellUs: earliestUs + spreadUs + this.#upTo(20_000),
      toldFired: false,
    });
  }

  /** Lets the board do what is due, in order of time, and its answers arrive. */
  #advance(untilUs: number): void {
    this.#nowUs = untilUs;
    const due = this.#sent.filter((one) => one.fellUs === -1 && !(one.startUs > untilUs));
    due.sort((a, b) => (a.startUs || 0) - (b.startUs || 0));
    for (const one of due) this.#begin(one);
    const waiting: Sent[] = [];
    for (const one of this.#sent) {
      if (one.fellUs === -1 || one.tellUs > untilUs) {
        this.#tellRise(one);
        waiting.push(one);
      } else {
        this.#tellEnd(one);
      }
    }
    this.#sent = waiting;
  }

  #begin(one: Sent): void {
    const { output } = one.order;
    const gapUs = this.config.outputs[output]!.leastGapUs;
    const collides = one.startUs < this.#busyUntilUs[output]! + gapUs;
    // Where slots are in play the board refuses what collides; without them nothing may.
    if (Number.isNaN(one.startUs) || (collides && this.#arms)) {
      one.startUs = Number.NaN;
      one.fellUs = Number.NaN;
      return;
    }
    const ran = this.#run(one.order, one.startUs, one.share);
    one.fellUs = ran.fellUs;
    one.onUs = ran.onUs;
    one.tellUs = Math.max(one.fellUs + this.#upTo(20_000), one.lost ? one.tellUs : 0);
    this.#busyUntilUs[output] = one.fellUs;
  }

  /** The pulses of an order, cut after `share` of its on-time. */
  #run(order: OutputOrder, startUs: number, share: number): { fellUs: number; onUs: number } {
    let leftUs = Math.max(1, Math.round(order.widthUs * order.repeats * share));
    const onUs = leftUs;
    let fellUs = startUs;
    for (let i = 0; i < order.repeats && leftUs > 0; i++) {
      const pulseUs = Math.min(order.widthUs, leftUs);
      const riseUs = startUs + i * order.periodUs;
      this.#rises.push({ output: order.output, startUs: riseUs, onUs: pulseUs });
      leftUs -= pulseUs;
      fellUs = riseUs + pulseUs;
    }
    return { fellUs, onUs };
  }

  #tellRise(one: Sent): void {
    if (one.toldFired || one.lost || !(one.startUs <= this.#nowUs) || one.fellUs === -1) return;
    one.toldFired = true;
    if (this.#roll() < 0.7) this.guard.fired(one.id, one.startUs);
  }

  #tellEnd(one: Sent): void {
    const { order } = one;
    this.#reservedNl -= order.volumeNl;
    if (one.lost) {
      this.guard.settle(one.id, 'uncertain', 0, this.#nowUs);
      this.#chargedNl += order.volumeNl;
      this.#uncertainNl += order.volumeNl;
      this.#lost.push(one);
    } else if (Number.isNaN(one.fellUs)) {
      this.guard.release(one.id);
    } else {
      this.guard.settle(one.id, 'done', one.onUs, one.fellUs);
      if (order.output === VALVE) this.#givenNl += volumeNl(one.onUs);
    }
  }

  /** Ends the sequence, and @returns what is broken. */
  broken(): string | undefined {
    while (this.#sent.length > 0) this.#advance(this.#nowUs + 1_000_000);
    return (
      this.#brokenBooks() ??
      this.#brokenWater() ??
      this.#brokenOutput(VALVE) ??
      this.#brokenOutput(LASER)
    );
  }

  #brokenBooks(): string | undefined {
    const { guard } = this;
    if ([...guard.unsettledIds].length > 0) return 'every id is settled in the end';
    if (guard.waterReservedNl !== this.#reservedNl) return 'reservations are conserved';
    if (guard.waterReservedNl !== 0) return 'nothing is reserved in the end';
    if (guard.waterGivenNl !== this.#givenNl) return 'water given is what ran';
    if (guard.waterUncertainNl !== this.#uncertainNl) return 'lost drops are uncertain in full';
    return undefined;
  }

  #brokenWater(): string | undefined {
    const { perSessionNl, perDayNl, mostDropNl, givenTodayNl } = this.config.water;
    const allNl = this.#givenNl + this.#chargedNl;
    if (allNl > perSessionNl) return 'water of the session';
    if (allNl > 0 && allNl + givenTodayNl > perDayNl) return 'water of the day';
    for (const { output, onUs } of this.#rises) {
      if (output === VALVE && volumeNl(onUs) > mostDropNl) return 'the largest drop';
    }
    return undefined;
  }

  #brokenOutput(output: number): string | undefined {
    const facts = this.config.outputs[output]!;
    const rises = this.#rises
      .filter((rise) => rise.output === output)
      .sort((a, b) => a.startUs - b.startUs);
    for (const [i, rise] of rises.entries()) {
      if (rise.onUs > facts.longestOnUs) return `${facts.name}: longest on-time`;
      const before = rises[i - 1];
      // A sham drives nothing, so that a slot of the board may fire across it.
      if (this.#arms || before === undefined) continue;
      if (rise.startUs - before.startUs - before.onUs < facts.leastGapUs) {
        return `${facts.name}: least gap`;
      }
    }
    if (facts.perSession !== undefined && this.#countOf(output, rises) > facts.perSession) {
      return `${facts.name}: pulses of the session`;
    }
    return facts.duty && this.#brokenDuty(rises, facts.duty.share, facts.duty.windowUs);
  }

  /** Rises real and sham; those of a lost id in full, whatever ran of it. */
  #countOf(output: number, rises: readonly Rise[]): number {
    let count = rises.length;
    for (const { order, fellUs, onUs } of this.#lost) {
      if (order.output !== output) continue;
      const ran = Number.isNaN(fellUs) ? 0 : Math.ceil(onUs / order.widthUs);
      count += order.repeats - ran;
    }
    return count;
  }

  /** The fullest window ends with a rise's end: no other need be looked at. */
  #brokenDuty(rises: readonly Rise[], share: number, windowUs: number): string | undefined {
    for (const last of rises) {
      const endUs = last.startUs + last.onUs;
      let onUs = 0;
      for (const rise of rises) {
        const from = Math.max(rise.startUs, endUs - windowUs);
        const to = Math.min(rise.startUs + rise.onUs, endUs);
        if (to > from) onUs += to - from;
      }
      if (onUs > share * windowUs) return 'laser: duty';
    }
    return undefined;
  }
}

function volumeNl(onUs: number): number {
  return Math.max(0, Math.round((onUs - DEAD_US) / US_PER_NL));
}

/** A rig from a seed. */
export function hostileRig(seed: number): HostileRig {
  return new HostileRig(dice(seed));
}
