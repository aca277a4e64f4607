import type { OutputProbe } from './board.js';
import type { BoardOutput } from './boardOutput.js';

/** What a simulated rig needs of the board in it: the simulated one, or the emulated firmware. */
export interface RigBoard {
  readonly boardUs: number;
  readonly worldUs: number;
  readonly tag: number;
  /** Bit n: output n is on. */
  readonly outputs: number;
  /** World time of the next change that an output makes by itself, where that is known. */
  readonly nextOutputUs: number;
  /** Counts that the belt may move before a slot could fire, where that is known. */
  countsToSlot(direction: 1 | -1): number;
  connect(output: BoardOutput): void;
  probe(probe: OutputProbe): void;
  advanceTo(worldUs: number): void;
  move(counts: number): void;
  setInput(input: number, level: 0 | 1): void;
  /** Sends a sample now, where the board can be told to. */
  look?(): void;
  receiveBytes(bytes: Uint8Array): void;
  reset(): void;
}
