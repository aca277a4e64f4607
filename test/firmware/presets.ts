/**
 * Sets what the running firmware counts with, so that tests need not wait for hours of board time or
 * thousands of millions of counts. The registers are those of avr/layer_board.h.
 */

import { CYCLES_PER_US } from '../../hardware-sim/emulator/chip.js';
import type { EmulatedBoard } from '../../hardware-sim/emulator/emulatedBoard.js';

/** COUNT_LOW, COUNT_1, COUNT_2, COUNT_3: GPIOR1, OCR0A, OCR0B, TCNT0. */
const COUNT_BYTES = [0x4a, 0x47, 0x48, 0x46] as const;

/** The encoder's count from now on; the lines stay as they are. */
export function presetCount(board: EmulatedBoard, count: number): void {
  COUNT_BYTES.forEach((address, n) => {
    board.chip.cpu.data[address] = (count >> (8 * n)) & 0xff;
  });
}

/** One round of the 16-bit clock, which ticks every half microsecond. */
const ROUND_US = 0x8000;

const u32 = (board: EmulatedBoard, at: number): number =>
  new DataView(board.chip.cpu.data.buffer, board.chip.cpu.data.byteOffset).getUint32(at, true);

/**
 * Where the firmware counts its clock's rounds: the one place in memory that says, at three times, how
 * many there have been. The program has no table of names on the chip.
 */
function findRounds(board: EmulatedBoard): number {
  const { chip } = board;
  const rounds = () =>
    Math.floor((chip.cpu.cycles - chip.timer1.startedAt) / (ROUND_US * CYCLES_PER_US));
  let found: number[] = [];
  for (let at = chip.layout.ramStart; at + 4 <= chip.cpu.data.length; at++) found.push(at);
  for (let n = 0; n < 3; n++) {
    // Well within a round, so that the interrupt has counted it.
    board.advanceTo(board.worldUs + 1.4 * ROUND_US - (board.boardUs % ROUND_US));
    found = found.filter((at) => u32(board, at) === rounds());
  }
  const [at] = found;
  if (at === undefined || found.length > 1) throw new Error(`rounds found at ${found.join()}`);
  return at;
}

/** Moves the board's clock forward by whole rounds, about `us`, at one stroke; nothing else moves. */
export class ClockPreset {
  readonly #board: EmulatedBoard;
  readonly #at: number;

  /** Right after a start: once the clock was moved, it cannot be found. */
  constructor(board: EmulatedBoard) {
    this.#board = board;
    this.#at = findRounds(board);
  }

  /** @returns by how much, microseconds */
  forward(us: number): number {
    const { data } = this.#board.chip.cpu;
    const view = new DataView(data.buffer, data.byteOffset);
    const rounds = Math.floor(us / ROUND_US);
    view.setUint32(this.#at, view.getUint32(this.#at, true) + rounds, true);
    return rounds * ROUND_US;
  }
}
