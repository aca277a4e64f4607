/**
 * The firmware of `hardware-sim/firmware`, run as it is flashed onto a board, with its pins and its
 * line in hand: bytes in and out, encoder steps, inputs, and outputs with the cycle of each change.
 * World time is microseconds since power-on; nothing moves but by `advanceTo`.
 */
import fs from 'node:fs';
import { packageRoot } from '../../server/packageRoot.js';
import { Chip, CYCLES_PER_US, RESET_FLAG } from './chip.js';
import { ATMEGA328P, ATMEGA2560, type ChipLayout } from './chipLayout.js';
import { parseHex } from './hexFile.js';

/** Where the firmware's wiring page says that things are. */
interface Wiring {
  readonly chip: ChipLayout;
  readonly encoder: readonly [port: string, a: number, b: number];
  readonly outputs: readonly [port: string, count: number];
  readonly inputs: readonly [port: string, count: number];
  readonly alive: readonly [port: string, bit: number];
}

export const EMULATED_BOARDS = {
  atmega328p: {
    chip: ATMEGA328P,
    encoder: ['D', 2, 3],
    outputs: ['C', 6],
    inputs: ['B', 5],
    alive: ['D', 4],
  },
  atmega2560: {
    chip: ATMEGA2560,
    encoder: ['E', 4, 5],
    outputs: ['A', 8],
    inputs: ['K', 8],
    alive: ['G', 5],
  },
} as const satisfies Record<string, Wiring>;
export type EmulatedBoardName = keyof typeof EMULATED_BOARDS;

export interface EmulatedBoardOptions {
  readonly board?: EmulatedBoardName;
  /** Another .hex file than the committed one. */
  readonly hexFile?: string;
  /** What the memory holds at power-on: chance, on a real chip. */
  readonly seed?: number;
  readonly eeprom?: Uint8Array;
}

/** The encoder's lines, A and B, at each quarter of a cycle; up is to the right. */
const QUARTERS = [
  [0, 0],
  [1, 0],
  [1, 1],
  [0, 1],
] as const;

/** Told of every change of an output, with the chip's cycle at which its pin changed. */
export type CycleProbe = (output: number, level: 0 | 1, cycle: number) => void;

export function committedHex(board: EmulatedBoardName): string {
  return `${packageRoot}/hardware-sim/firmware/hex/${board}.hex`;
}

export class EmulatedBoard {
  readonly chip: Chip;
  readonly name: EmulatedBoardName;
  /** Called with what the board has said, byte by byte as the stop bits end. */
  said: (bytes: Uint8Array) => void = () => {};
  probe: CycleProbe = () => {};
  /** How often the line that feeds the monostable has changed. */
  aliveChanges = 0;
  readonly #wiring: Wiring;
  readonly #byte = new Uint8Array(1);
  #quarter = 0;

  constructor(options: EmulatedBoardOptions = {}) {
    this.name = options.board ?? 'atmega328p';
    this.#wiring = EMULATED_BOARDS[this.name];
    const hex = fs.readFileSync(options.hexFile ?? committedHex(this.name), 'latin1');
    const { chip } = this.#wiring;
    this.chip = new Chip(parseHex(hex, chip.flashWords), chip, options.eeprom);
    fillMemory(this.chip.cpu.data, chip.ramStart, options.seed ?? 1);
    this.chip.usart.sent = (byte) => {
      this.#byte[0] = byte;
      this.said(this.#byte);
    };
    this.chip.pins.probe = (port, levels, changed, cycle) => {
      this.#pinsChanged(port, levels, changed, cycle);
    };
    this.#drivePins();
  }

  /** World time, microseconds since power-on; the last instruction may have run a little over. */
  get worldUs(): number {
    return this.chip.cpu.cycles / CYCLES_PER_US;
  }

  /** Board time, not wrapped: from when the firmware started its clock. */
  get boardUs(): number {
    return (this.chip.cpu.cycles - this.chip.timer1.startedAt) / CYCLES_PER_US;
  }

  get cycle(): number {
    return this.chip.cpu.cycles;
  }

  /** Levels at the outputs' pins, bit n for output n. */
  get outputLevels(): number {
    const [port, count] = this.#wiring.outputs;
    return this.chip.pins.levels(port) & ((1 << count) - 1);
  }

  /** Bit n: output n's pin is an output of the chip. */
  get outputsDriven(): number {
    const [port, count] = this.#wiring.outputs;
    return this.chip.pins.outputs(port) & ((1 << count) - 1);
  }

  advanceTo(worldUs: number): void {
    this.chip.run(worldUs * CYCLES_PER_US);
  }

  runToCycle(cycle: number): void {
    this.chip.run(cycle);
  }

  /** What a host sends; it arrives at the pace of the line. */
  receiveBytes(bytes: Uint8Array): void {
    this.chip.usart.receive(bytes);
  }

  /** One count up or down, at this moment. */
  step(direction: 1 | -1): void {
    this.#quarter = (this.#quarter + direction) & 3;
    const [a, b] = QUARTERS[this.#quarter]!;
    this.setQuadrature(a, b);
  }

  /** Both lines change at once: no direction can be told from it. */
  jump(): void {
    this.#quarter = (this.#quarter + 2) & 3;
    const [a, b] = QUARTERS[this.#quarter]!;
    this.setQuadrature(a, b);
  }

  setQuadrature(a: 0 | 1, b: 0 | 1): void {
    const [port, bitA, bitB] = this.#wiring.encoder;
    const { pins } = this.chip;
    pins.drive(port, bitA, a);
    pins.drive(port, bitB, b);
  }

  /** An input's level, 1 for active; the pin is low then. */
  setInput(input: number, level: 0 | 1): void {
    const [port] = this.#wiring.inputs;
    this.chip.pins.drive(port, input, level === 1 ? 0 : 1);
  }

  /** The reset button, or a host that opens the port. */
  reset(): void {
    this.chip.reset(RESET_FLAG.external);
  }

  #drivePins(): void {
    this.setQuadrature(0, 0);
    const [, inputs] = this.#wiring.inputs;
    for (let n = 0; n < inputs; n++) this.setInput(n, 0);
  }

  #pinsChanged(port: string, levels: number, changed: number, cycle: number): void {
    const { outputs, alive } = this.#wiring;
    if (port === outputs[0]) {
      for (let n = 0; n < outputs[1]; n++) {
        if (changed & (1 << n)) this.probe(n, levels & (1 << n) ? 1 : 0, cycle);
      }
    } else if (port === alive[0] && changed & (1 << alive[1])) {
      this.aliveChanges++;
    }
  }
}

/** Xorshift noise from `from` up, as memory holds when the power comes. */
export function fillMemory(data: Uint8Array, from: number, seed: number): void {
  let x = seed | 0 || 1;
  for (let at = from; at < data.length; at++) {
    x ^= x << 13;
    x ^= x >>> 17;
    x ^= x << 5;
    data[at] = x & 0xff;
  }
}
