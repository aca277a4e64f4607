/**
 * A whole rig without hardware: the animal runs, the belt turns the encoder, the mark and the
 * tongue touch their sensors, the board reports and fires, and the drops reach the animal. On a
 * virtual clock: only `advanceTo` moves it, in microseconds of world time.
 */
import { Animal } from './animal/animal.js';
import { BELT, Belt, type BeltParameters } from './animal/belt.js';
import { Dice } from './animal/dice.js';
import { ANIMAL, type AnimalParameters } from './animal/parameters.js';
import { PendingInputs } from './animal/pendingInputs.js';
import { SeamMark } from './animal/seamMark.js';
import { Board } from './board/board.js';
import type { BoardOutput } from './board/boardOutput.js';
import type { BoardOptions } from './board/boardSetting.js';
import type { RigBoard } from './board/rigBoard.js';

/** Which number on the board goes where. */
export interface Wiring {
  readonly lickInput: number;
  readonly seamInput: number;
  readonly valveOutput: number;
}

/** The simulated valve's line: open for `deadUs + ul * usPerUl`. */
export interface ValveParameters {
  readonly deadUs: number;
  readonly usPerUl: number;
}

export interface SimulatedRigOptions {
  readonly seed?: number;
  /** Has learned already that water comes at `spoutCm`. */
  readonly trained?: boolean;
  readonly spoutCm?: number;
  /** Where the animal stands at first, cm along the belt. */
  readonly startCm?: number;
  readonly belt?: Partial<BeltParameters>;
  readonly animal?: Partial<AnimalParameters>;
  readonly board?: BoardOptions;
  readonly wiring?: Partial<Wiring>;
  readonly valve?: Partial<ValveParameters>;
  /** Extra changes at the beginning of a lick's contact. */
  readonly lickBounces?: number;
  /** The encoder counts down as the animal runs. */
  readonly reversed?: boolean;
  /** How long the animal keeps a speed, microseconds, in whole milliseconds; 1000 unless said. */
  readonly strideUs?: number;
  /** A wire from an output to an input. */
  readonly loopback?: { readonly output: number; readonly input: number };
}

/** How long a change takes along the loopback wire and through the input's filter. */
const WIRE_US = 3;
/** One drop differs from the next by this share (standard deviation), where it is weighed. */
const DROP_SPREAD = 0.03;
const TAP_US = 60_000;

/** The shortest stretch in which the belt runs at one speed, and the grid of the board's looks. */
const GRID_US = 1000;
const EVENT = { none: 0, input: 1, lick: 2, output: 3, mark: 4, slot: 5, look: 6 } as const;
const NEVER = Number.POSITIVE_INFINITY;

export class SimulatedRig<B extends RigBoard = Board> {
  readonly board: B;
  readonly animal: Animal;
  readonly belt: Belt;
  readonly wiring: Wiring;
  readonly valve: ValveParameters;
  /** The belt is driven at this speed, whatever the animal wants; undefined: the animal runs. */
  forcedCmPerS: number | undefined;
  nowUs = 0;
  /** How often each output has risen, whatever any host believes. */
  readonly rises: number[] = new Array(16).fill(0);
  /** Under the spout stands a vial on a balance: drops go there, and not to the animal. */
  vial = false;
  /** What the vial holds, mg (a microlitre of water is very nearly one). */
  vialMg = 0;
  readonly #weights: Dice;
  readonly #loopback: SimulatedRigOptions['loopback'];
  /** Where a hand turns the belt to, unrolled cm, and how fast. */
  #handToCm = Number.NaN;
  #handCmPerS = 0;
  readonly #mark: SeamMark;
  readonly #pending = new PendingInputs();
  readonly #dice: Dice;
  readonly #lickBounces: number;
  readonly #segmentUs: number;
  #segmentEndUs: number;
  readonly #strideUs: number;
  #strideEndUs: number;
  /** What the host wants to be shown: counts above and below, and a time on the grid. */
  #lookUpCount = NEVER;
  #lookDownCount = -NEVER;
  #lookUs = NEVER;
  #cmPerUs = 0;
  /** -1: the board counts down as the belt runs forwards. */
  readonly #sense: 1 | -1;
  /** Whole counts that the belt has run so far, not wrapped. */
  #count: number;
  #valveOpenedUs = 0;

  /** @param board another board than the simulated one, which `output` hears */
  constructor(options: SimulatedRigOptions = {}, output?: BoardOutput, board?: B) {
    const seed = options.seed ?? 1;
    const beltParameters = { ...BELT, ...options.belt };
    const animalParameters = { ...ANIMAL, ...options.animal };
    const startCm = options.startCm ?? beltParameters.lengthCm * 0.9;
    this.wiring = { lickInput: 0, seamInput: 1, valveOutput: 0, ...options.wiring };
    this.valve = { deadUs: 5_000, usPerUl: 8_000, ...options.valve };
    this.#lickBounces = options.lickBounces ?? 0;
    this.#dice = new Dice(seed + 5);
    this.#weights = new Dice(seed + 6);
    this.#loopback = options.loopback;
    this.#sense = options.reversed === true ? -1 : 1;
    this.#strideUs = options.strideUs ?? GRID_US;
    this.#strideEndUs = this.#strideUs;
    this.#segmentUs = options.board?.reportUs ?? GRID_US;
    this.#segmentEndUs = this.#segmentUs;
    this.#count = options.board?.startCount ?? 0;
    this.belt = new Belt(beltParameters, startCm, this.#count, seed + 2);
    this.#mark = new SeamMark(beltParameters, startCm, seed + 3);
    const startInputs = this.#mark.level << this.wiring.seamInput;
    const ready = board ?? new Board({ seed: seed + 1, startInputs, ...options.board }, output);
    this.board = ready as B;
    if (board !== undefined) board.setInput(this.wiring.seamInput, this.#mark.level);
    this.animal = new Animal(
      animalParameters,
      beltParameters.lengthCm,
      seed + 4,
      options.trained ?? false,
      options.spoutCm ?? beltParameters.lengthCm / 2,
      this.#strideUs,
    );
    this.board.probe((number, on, worldUs) => this.#outputChanged(number, on, worldUs));
  }

  /** Lets the world run until `us`, whole microseconds. */
  advanceTo(us: number): void {
    while (this.#segmentEndUs <= us) {
      this.#runTo(this.#segmentEndUs);
      this.#segmentEndUs += this.#segmentUs;
      if (this.nowUs < this.#strideEndUs) continue;
      this.#strideEndUs += this.#strideUs;
      const wants = this.animal.step(this.nowUs, this.belt.positionCm);
      if (!Number.isNaN(this.#handToCm)) this.#turnOn();
      this.#cmPerUs = (this.forcedCmPerS ?? wants) * 1e-6;
    }
    if (us > this.nowUs) this.#runTo(us);
  }

  /**
   * Asks the board for a sample once the encoder has come so many counts up or down from where it
   * is, or at a time (world microseconds): at the end of that millisecond, as a board that looks
   * every millisecond would send it. Replaces what was asked before.
   */
  lookAt(upCounts: number, downCounts: number, us: number): void {
    this.#lookUpCount = this.#count + upCounts;
    this.#lookDownCount = this.#count - downCounts;
    this.#lookUs = gridUs(us > this.nowUs ? us : this.nowUs + 1);
  }

  /** A hand turns the belt so far, forwards or back, and then holds it still. */
  turn(cm: number, cmPerS: number): void {
    this.#handToCm = this.belt.travelCm + cm;
    this.#handCmPerS = Math.abs(cmPerS);
  }

  /** An input is touched for a moment, as one presses a button. */
  tap(input: number): void {
    this.board.setInput(input, 1);
    this.#pending.add(this.nowUs + TAP_US, input, 0);
  }

  /** The hand has not come to where it turns the belt. */
  get turning(): boolean {
    return !Number.isNaN(this.#handToCm);
  }

  /** As much of the hand's way as the coming stride has room for. */
  #turnOn(): void {
    const leftCm = this.#handToCm - this.belt.travelCm;
    const mostCm = this.#handCmPerS * this.#strideUs * 1e-6;
    const stepCm = Math.max(-mostCm, Math.min(mostCm, leftCm));
    this.forcedCmPerS = stepCm / (this.#strideUs * 1e-6);
    if (Math.abs(leftCm) > 1e-6) return;
    this.#handToCm = Number.NaN;
    this.forcedCmPerS = 0;
  }

  /** The encoder turns without the belt, by so many cm as it would read them, at this moment. */
  slip(cm: number): void {
    this.belt.slip(cm);
    this.#followEncoder();
  }

  /** Runs to a time within the present stretch, in which the speed stays as it is. */
  #runTo(untilUs: number): void {
    const { belt, board, animal } = this;
    for (;;) {
      let atUs = untilUs;
      let event: number = EVENT.none;
      if (this.#pending.nextUs < atUs) {
        atUs = this.#pending.nextUs;
        event = EVENT.input;
      }
      if (animal.licking.nextUs < atUs) {
        atUs = animal.licking.nextUs;
        event = EVENT.lick;
      }
      if (board.nextOutputUs < atUs) {
        atUs = board.nextOutputUs;
        event = EVENT.output;
      }
      if (this.#lookUs < atUs) {
        atUs = this.#lookUs;
        event = EVENT.look;
      }
      const cmPerUs = this.#cmPerUs;
      if (atUs < this.nowUs) atUs = this.nowUs;
      if (cmPerUs !== 0) {
        const forwards = cmPerUs > 0;
        const cm = cmPerUs * (atUs - this.nowUs);
        const markCm = forwards ? this.#mark.upCm : this.#mark.downCm;
        const travelled = belt.travelCm + cm;
        if (forwards ? travelled >= markCm : travelled < markCm) {
          const us = this.nowUs + Math.ceil((markCm - belt.travelCm) / cmPerUs);
          atUs = us < this.nowUs ? this.nowUs : Math.min(us, atUs);
          event = EVENT.mark;
        }
        const slotUs = this.#slotUs(atUs);
        if (slotUs <= atUs) {
          this.#fireSlotAt(Math.max(slotUs, this.nowUs));
          continue;
        }
        if (this.#comesToLook(atUs)) continue;
        this.#moveBeltTo(atUs);
      }
      board.advanceTo(atUs);
      this.nowUs = atUs;
      if (event === EVENT.none) return;
      this.#act(event);
    }
  }

  #act(event: number): void {
    const { board, wiring } = this;
    if (event === EVENT.input) {
      const { input, level } = this.#pending.take();
      board.setInput(input, level);
    } else if (event === EVENT.lick) {
      this.#lick();
    } else if (event === EVENT.mark) {
      if (this.#mark.cross(this.#cmPerUs > 0)) this.#edge(wiring.seamInput, this.#mark.level);
    } else if (event === EVENT.look) {
      this.#lookUs = NEVER;
      board.look?.();
    }
  }

  /** Turns the belt to where it is at `atUs`; no slot lies on the way. */
  #moveBeltTo(atUs: number): void {
    this.belt.move(this.#cmPerUs * (atUs - this.nowUs));
    this.#followEncoder();
  }

  #followEncoder(): void {
    const count = Math.floor(this.belt.encoder);
    if (count !== this.#count) {
      this.#turn(count - this.#count);
      this.#count = count;
    }
  }

  /** The encoder turns by so many counts, as the belt runs forwards. */
  #turn(counts: number): void {
    this.board.move(this.#sense === 1 ? counts : -counts);
  }

  /** When the encoder comes to the nearest armed slot in its direction; Infinity: not by `atUs`. */
  #slotUs(atUs: number): number {
    const { belt, board } = this;
    const countsPerUs = this.#cmPerUs * belt.countsPerTravelCm;
    const counts = Math.floor(belt.encoder + countsPerUs * (atUs - this.nowUs)) - this.#count;
    if (counts > 0) {
      const gap = board.countsToSlot(this.#sense);
      if (counts < gap) return Number.POSITIVE_INFINITY;
      return Math.min(
        atUs,
        this.nowUs + Math.ceil((this.#count + gap - belt.encoder) / countsPerUs),
      );
    }
    if (counts < 0) {
      const gap = board.countsToSlot(this.#sense === 1 ? -1 : 1);
      if (-counts < gap) return Number.POSITIVE_INFINITY;
      return Math.min(
        atUs,
        this.nowUs + Math.ceil((this.#count - gap + 1 - belt.encoder) / countsPerUs),
      );
    }
    return Number.POSITIVE_INFINITY;
  }

  /** A count to be looked at is passed by `atUs`, and the millisecond of it ends before. */
  #comesToLook(atUs: number): boolean {
    const { belt } = this;
    const countsPerUs = this.#cmPerUs * belt.countsPerTravelCm;
    const encoder = belt.encoder + countsPerUs * (atUs - this.nowUs);
    let counts: number;
    if (encoder >= this.#lookUpCount) counts = this.#lookUpCount - belt.encoder;
    else if (encoder < this.#lookDownCount + 1) counts = this.#lookDownCount + 1 - belt.encoder;
    else return false;
    this.#lookUpCount = NEVER;
    this.#lookDownCount = -NEVER;
    const us = gridUs(this.nowUs + Math.max(0, Math.ceil(counts / countsPerUs)));
    if (us < this.#lookUs) this.#lookUs = us;
    return us < atUs;
  }

  /** The count that fires a slot happens at its own microsecond. */
  #fireSlotAt(atUs: number): void {
    const { belt, board } = this;
    const forwards = this.#cmPerUs > 0;
    const gap = board.countsToSlot(forwards === (this.#sense === 1) ? 1 : -1);
    belt.move(this.#cmPerUs * (atUs - this.nowUs));
    const target = this.#count + (forwards ? gap : -gap);
    this.#turn(target - this.#count - (forwards ? 1 : -1));
    board.advanceTo(atUs);
    this.#turn(forwards ? 1 : -1);
    this.nowUs = atUs;
    this.#count = target;
    // Rounding must not set the encoder back over the count that it has just passed.
    if (forwards) belt.encoder = Math.max(belt.encoder, target);
    else belt.encoder = Math.min(belt.encoder, target + 1 - 1e-6);
  }

  #edge(input: number, level: 0 | 1): void {
    const { markBounces } = this.belt.parameters;
    this.board.setInput(input, level);
    let us = this.nowUs;
    for (let n = 0; n < markBounces; n++) {
      us += this.#mark.bounceUs();
      this.#pending.add(us, input, level === 1 ? 0 : 1);
      us += this.#mark.bounceUs();
      this.#pending.add(us, input, level);
    }
  }

  #lick(): void {
    const { animal, board, wiring } = this;
    const { tongue } = animal.licking;
    const contactUs = animal.licking.touch();
    if (tongue) animal.licked();
    board.setInput(wiring.lickInput, 1);
    let us = this.nowUs;
    for (let n = 0; n < this.#lickBounces; n++) {
      us += Math.round(this.#dice.between(100, 900));
      this.#pending.add(us, wiring.lickInput, 0);
      us += Math.round(this.#dice.between(100, 900));
      this.#pending.add(us, wiring.lickInput, 1);
    }
    this.#pending.add(this.nowUs + Math.max(contactUs, us - this.nowUs + 1), wiring.lickInput, 0);
  }

  #outputChanged(output: number, on: boolean, worldUs: number): void {
    if (on) this.rises[output]!++;
    const loop = this.#loopback;
    if (loop?.output === output) this.#pending.add(worldUs + WIRE_US, loop.input, on ? 1 : 0);
    if (output !== this.wiring.valveOutput) return;
    if (on) {
      this.#valveOpenedUs = worldUs;
      return;
    }
    const openUs = worldUs - this.#valveOpenedUs - this.valve.deadUs;
    if (openUs <= 0) return;
    const ul = openUs / this.valve.usPerUl;
    if (this.vial) this.vialMg += ul * (1 + DROP_SPREAD * this.#weights.normal());
    else this.animal.drop(ul, this.belt.positionCm, worldUs);
  }
}

/** The end of the millisecond that a time lies in. */
function gridUs(us: number): number {
  return Math.ceil(us / GRID_US) * GRID_US;
}
