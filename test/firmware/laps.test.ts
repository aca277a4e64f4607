/**
 * Whole sessions on the emulated firmware, with a host that is stalled at random for up to 100 ms:
 * what the board does is read from its pins and from the belt's true counts.
 */
import { expect, test } from 'vitest';
import { Dice } from '../../hardware-sim/animal/dice.js';
import { EmulatedRigBoard } from '../../hardware-sim/emulator/emulatedRigBoard.js';
import { SimulatedRig } from '../../hardware-sim/simulatedRig.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import { type BoardListener, rehearse, type VirtualRig } from '../../server/session/rehearsal.js';
import type { Rig } from '../../server/session/rig/rig.js';
import { FrameEncoder } from '../../server/wire/codec.js';
import type { HostMessageName, MessageOf } from '../../server/wire/messages.js';
import { demoRig, setupOf } from '../session/rehearsed.js';

const LENGTH_CM = 12;
const COUNTS_PER_CM = 25;
const RULES = `
title: Marks on every lap
belt: ${LENGTH_CM} cm
rules:
  early:
    when: reaches 3 cm
    do: pulse laser for 2 ms
    within: 5 mm
  late:
    when: reaches 8 cm
    do: pulse laser for 2 ms
    within: 5 mm
end: time >= 60 min
`;

/** The firmware, the belt and the animal, to a host that now and then does nothing for a while. */
class StalledRig implements VirtualRig {
  readonly rig: SimulatedRig<EmulatedRigBoard>;
  readonly #board = new EmulatedRigBoard({ seed: 5 });
  readonly #encoder = new FrameEncoder();
  readonly #dice = new Dice(11);
  readonly #speedCmPerS: (dice: Dice) => number;
  #heard: (() => void)[] = [];
  #said: Uint8Array[] = [];
  #stalledUntilUs = 0;
  #nextStallUs = 400_000;
  #speedUntilUs = 0;
  stalls = 0;

  constructor(speedCmPerS: (dice: Dice) => number) {
    this.#speedCmPerS = speedCmPerS;
    const belt = { lengthCm: LENGTH_CM, countsPerCm: COUNTS_PER_CM, slipPerLapCm: 0 };
    const valve = { deadUs: 8_000, usPerUl: 12_000 };
    this.rig = new SimulatedRig({ seed: 5, belt, valve }, undefined, this.#board);
  }

  get nowUs(): number {
    return this.rig.nowUs;
  }

  connect(listener: BoardListener): void {
    const later =
      <M extends object>(tell: (message: M, tag: number) => void) =>
      (message: M, tag: number) => {
        const kept = { ...message };
        this.#heard.push(() => tell(kept, tag));
      };
    this.#board.connect({
      // Within the handshake nobody is stalled.
      identity: (message, tag) => listener.identity(message, tag),
      sample: later(listener.sample),
      edge: later(listener.edge),
      outcome: later(listener.outcome),
      fault: later(listener.fault),
      clock: later(listener.clock),
    });
  }

  receive<N extends HostMessageName>(name: N, message: MessageOf[N], tag: number): void {
    const bytes = this.#encoder.encode(name, message, name === 'identify' ? 1 : tag).slice();
    this.#said.push(bytes);
    if (name !== 'identify') return;
    this.#deliver();
    this.rig.advanceTo(this.nowUs + 10_000);
    this.#heard = [];
  }

  advanceTo(us: number): void {
    const stalled = us < this.#stalledUntilUs;
    if (!stalled) {
      this.#deliver();
      if (us >= this.#nextStallUs) {
        this.stalls++;
        this.#stalledUntilUs = us + this.#dice.between(5_000, 100_000);
        this.#nextStallUs = us + this.#dice.between(150_000, 500_000);
      }
    }
    if (us >= this.#speedUntilUs) {
      this.rig.forcedCmPerS = this.#speedCmPerS(this.#dice);
      this.#speedUntilUs = us + 80_000;
    }
    this.rig.advanceTo(Math.max(us, this.nowUs));
    if (stalled) return;
    const heard = this.#heard;
    this.#heard = [];
    for (const tell of heard) tell();
  }

  #deliver(): void {
    for (const bytes of this.#said) this.#board.receiveBytes(bytes);
    this.#said = [];
  }
}

function run(speedCmPerS: (dice: Dice) => number, laps: number) {
  const rig: Rig = { ...demoRig, belt: { ...demoRig.belt, lengthCm: LENGTH_CM } };
  const virtual = new StalledRig(speedCmPerS);
  const decisions: StampedDecision[] = [];
  const setup = setupOf(RULES, 'a seed', rig);
  rehearse(setup, virtual, {
    mostUs: 3_600_000_000,
    onDecision: (decision) => decisions.push(structuredClone(decision)),
    began: (runner) => {
      const { advanceTo } = virtual;
      virtual.advanceTo = (us) => {
        advanceTo.call(virtual, us);
        if (virtual.rig.belt.lap < laps || runner.core.state === 'ended') return;
        const by = { who: 'the test', from: 'here' };
        runner.take({ kind: 'operator', act: { act: 'end', reason: 'enough laps' }, by });
      };
    },
  });
  return { virtual, decisions };
}

test.each([
  ['realistic', 60, (dice: Dice) => dice.between(15, 60)],
  ['extreme', 140, (dice: Dice) => dice.between(90, 220)],
] as const)(
  'at %s speeds every armed firing is within a count of its place, none twice',
  (_, laps, speed) => {
    const { virtual, decisions } = run(speed, laps);
    const fired = decisions.filter((one) => one.kind === 'fired');
    const armed = fired.filter((one) => one.armed);
    expect(virtual.stalls).toBeGreaterThan(20);
    expect(armed.length).toBeGreaterThan(laps);
    const countMm = 10 / COUNTS_PER_CM;
    for (const one of armed) expect(Math.abs(one.errorMm!)).toBeLessThanOrEqual(countMm + 1e-6);
    const serials = fired.map(({ rule, serial }) => `${rule} ${serial}`);
    expect(new Set(serials).size).toBe(serials.length);
    // The pins rose as often as the session says, and never for a lap twice.
    const rose = virtual.rig.rises.reduce((sum, rises) => sum + rises, 0);
    expect(rose).toBe(fired.length);
    expect(rose).toBeLessThanOrEqual(2 * (laps + 1));
  },
  120_000,
);
