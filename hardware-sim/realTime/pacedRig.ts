import { Dice } from '../animal/dice.js';
import { FramedOutput } from '../board/boardOutput.js';
import type { RigBoard } from '../board/rigBoard.js';
import { EmulatedRigBoard } from '../emulator/emulatedRigBoard.js';
import { SimulatedRig, type SimulatedRigOptions } from '../simulatedRig.js';
import type { ByteLine } from './byteLine.js';

/** Further behind the wall clock than this, the rig lets the time go instead of catching up. */
const MOST_BEHIND_US = 100_000;
/**
 * The same for the emulated board, which takes a good part of a processor: on a busy computer its clock
 * goes slow rather than running ahead of what the host has to say to it.
 */
const EMULATED_MOST_BEHIND_US = 10_000;
const BUFFER_BYTES = 65_536;

/** A simulated rig that keeps up with the wall clock, a step a millisecond, on a line of bytes. */
export class PacedRig {
  readonly rig: SimulatedRig<RigBoard>;
  line: ByteLine | undefined;
  /** Chance that a bit is flipped, either way. */
  noise = 0;
  readonly #dice: Dice;
  readonly #mostBehindUs: number;
  readonly #buffer = new Uint8Array(BUFFER_BYTES);
  #length = 0;
  /** Wall time less rig time, microseconds. */
  #behindUs = wallUs();
  #stalledUntilUs = 0;
  #timer: NodeJS.Timeout | undefined;

  /** @param emulated the board is the firmware, run by the emulator */
  constructor(options: SimulatedRigOptions, emulated = false) {
    this.#mostBehindUs = emulated ? EMULATED_MOST_BEHIND_US : MOST_BEHIND_US;
    if (emulated) {
      const board = new EmulatedRigBoard({ seed: options.seed ?? 1 });
      board.bytes = (bytes) => this.#keep(bytes);
      this.rig = new SimulatedRig<RigBoard>(options, undefined, board);
    } else {
      const output = new FramedOutput((bytes) => this.#keep(bytes));
      this.rig = new SimulatedRig(options, output);
    }
    this.#dice = new Dice((options.seed ?? 1) + 77);
  }

  start(): void {
    this.#behindUs = wallUs();
    this.#timer = setInterval(() => this.step(), 1);
  }

  stop(): void {
    clearInterval(this.#timer);
  }

  /** Lets the rig come up to the wall clock, and sends what it said. */
  step(): void {
    const nowUs = wallUs();
    if (this.#stalledUntilUs > 0) {
      if (nowUs < this.#stalledUntilUs) return;
      this.#stalledUntilUs = 0;
      this.line?.pause(false);
    }
    const lateUs = nowUs - this.#behindUs - this.rig.nowUs;
    if (lateUs > this.#mostBehindUs) this.#behindUs += lateUs - this.#mostBehindUs;
    this.rig.advanceTo(nowUs - this.#behindUs);
    this.flush();
  }

  /** Bytes from the host, acted on at the present moment rather than at the next step. */
  heard(bytes: Uint8Array): void {
    // What was read before a stall began is not lost: the step below does not run in a stall.
    this.step();
    this.rig.board.receiveBytes(this.noise > 0 ? this.#spoil(bytes) : bytes);
    this.flush();
  }

  /** Neither moves, nor reads, nor writes for so long. */
  stall(ms: number): void {
    this.#stalledUntilUs = wallUs() + Math.round(ms * 1000);
    this.line?.pause(true);
  }

  flush(): void {
    if (this.#length === 0) return;
    const bytes = this.#buffer.subarray(0, this.#length);
    this.#length = 0;
    this.line?.write(this.noise > 0 ? this.#spoil(bytes) : bytes);
  }

  #keep(bytes: Uint8Array): void {
    if (this.#length + bytes.length > BUFFER_BYTES) this.flush();
    this.#buffer.set(bytes, this.#length);
    this.#length += bytes.length;
  }

  #spoil(bytes: Uint8Array): Uint8Array {
    const spoilt = bytes.slice();
    const bits = spoilt.length * 8;
    // From one flip to the next at once, so that clean stretches cost nothing.
    for (let bit = this.#gap(); bit < bits; bit += 1 + this.#gap()) {
      spoilt[bit >> 3]! ^= 1 << (bit & 7);
    }
    return spoilt;
  }

  #gap(): number {
    return Math.floor(Math.log(1 - this.#dice.unit()) / Math.log(1 - this.noise));
  }
}

function wallUs(): number {
  return Math.floor(performance.now() * 1000);
}
