import type { BoardOutput } from '../../hardware-sim/board/boardOutput.js';
import { SimulatedRig, type SimulatedRigOptions } from '../../hardware-sim/simulatedRig.js';
import { PROTOCOL_VERSION } from '../../server/wire/messages.js';

const TAG = 0x55;
const BEAT_US = 25_000;
export const PLACE_CM = 90;
/** The rig's own valve line: 5 ms and 8 ms a microlitre. */
const DROP_UL = 4;

export interface Lick {
  us: number;
  positionCm: number;
  contactUs: number;
}

/**
 * The simplest rule there is, by the true position: a drop at one place, once a lap. Notes what the
 * animal does a hundred times a second.
 */
export class WaterHost {
  readonly rig: SimulatedRig;
  readonly licks: Lick[] = [];
  readonly speeds: number[] = [];
  readonly positions: number[] = [];
  drops = 0;
  giving = true;
  #placeCm: number;
  #lastLap = Number.NEGATIVE_INFINITY;
  #beatUs = 0;
  #id = 1;
  #noteUs = 0;

  constructor(options: SimulatedRigOptions = {}, placeCm = PLACE_CM) {
    this.#placeCm = placeCm;
    const none = () => {};
    const output: BoardOutput = {
      identity: none,
      sample: (message, tag) => {
        if (tag === TAG) this.#look(message.boardUs);
      },
      edge: (message) => {
        if (message.input !== this.rig.wiring.lickInput) return;
        if (message.level === 1) {
          const { positionCm } = this.rig.belt;
          this.licks.push({ us: message.boardUs, positionCm, contactUs: 0 });
        } else {
          const lick = this.licks.at(-1);
          if (lick !== undefined) lick.contactUs = message.boardUs - lick.us;
        }
      },
      outcome: none,
      fault: (message) => {
        throw new Error(`fault ${message.fault}`);
      },
      clock: none,
    };
    this.rig = new SimulatedRig({ spoutCm: PLACE_CM, ...options }, output);
    const { board } = this.rig;
    board.receive('identify', { nonce: 1, protocol: PROTOCOL_VERSION, newTag: TAG }, 0);
    board.receive('beat', { finishedUs: 0, wanted: 0 }, TAG);
    const limits = { longestOnUs: 1_000_000, leastGapUs: 0, allowanceUs: 4e9, leastCounts: 0 };
    board.receive('configure', { output: 0, flags: 0, allowanceRises: 65_535, ...limits }, TAG);
  }

  /** Runs on for so many minutes, at most a wrap of board time in all. */
  runMinutes(minutes: number): void {
    this.rig.advanceTo(this.rig.nowUs + Math.round(minutes * 60e6));
  }

  /** Where water comes from now on. */
  moveTo(placeCm: number): void {
    this.#placeCm = placeCm;
  }

  #look(boardUs: number): void {
    const { belt, board, animal } = this.rig;
    if (boardUs - this.#beatUs >= BEAT_US) {
      this.#beatUs = boardUs;
      board.receive('beat', { finishedUs: boardUs, wanted: 0 }, TAG);
    }
    if (boardUs >= this.#noteUs) {
      this.#noteUs = boardUs + 10_000;
      this.speeds.push(animal.speedCmPerS);
      this.positions.push(belt.positionCm);
    }
    const here = belt.positionCm >= this.#placeCm && belt.positionCm < this.#placeCm + 5;
    if (!here || belt.lap <= this.#lastLap || !this.giving) return;
    this.#lastLap = belt.lap;
    this.drops++;
    const pulse = { output: 0, flags: 0, widthUs: 5000 + 8000 * DROP_UL, periodUs: 0, repeats: 1 };
    const when = { startUs: 0, expiryUs: boardUs + 50_000, countFrom: 0, countTo: 0 };
    board.receive('pulse', { id: this.#id++, ...pulse, ...when }, TAG);
  }
}

/** The middle value. */
export function median(values: readonly number[]): number {
  return [...values].sort((a, b) => a - b)[Math.floor(values.length / 2)]!;
}

/** Intervals between licks of one bout: those under 300 ms. */
export function lickIntervalsS(licks: readonly Lick[]): number[] {
  return licks
    .slice(1)
    .map((lick, n) => (lick.us - licks[n]!.us) / 1e6)
    .filter((seconds) => seconds < 0.3);
}

/** Cm from `positionCm` forwards to a place, [0, length). */
export function aheadCm(positionCm: number, placeCm: number, lengthCm = 180): number {
  return (((placeCm - positionCm) % lengthCm) + lengthCm) % lengthCm;
}
