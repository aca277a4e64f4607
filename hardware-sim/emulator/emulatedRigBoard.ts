/**
 * The emulated firmware in the place of the simulated board, in a rig: the same animal, belt and
 * sensors, the real program. The rig moves the belt in steps of up to a millisecond; the encoder's
 * edges are spread over each, as a belt at that speed has them.
 */
import { blank } from '../../server/wire/codec.js';
import { FrameDecoder } from '../../server/wire/frameDecoder.js';
import type { OutputProbe } from '../board/board.js';
import { type BoardOutput, NoOutput } from '../board/boardOutput.js';
import type { RigBoard } from '../board/rigBoard.js';
import { NO_SLOT } from '../board/slots.js';
import { CYCLES_PER_US } from './chip.js';
import { EmulatedBoard, type EmulatedBoardOptions } from './emulatedBoard.js';

/** The firmware's own beginning is over by then: EEPROM, watchdog, identity. */
const BEGINNING_US = 60_000;

export class EmulatedRigBoard implements RigBoard {
  readonly board: EmulatedBoard;
  /** Told of the bytes that the board sends, as they come. */
  bytes: (bytes: Uint8Array) => void = () => {};
  readonly nextOutputUs = Number.POSITIVE_INFINITY;
  #output: BoardOutput = new NoOutput();
  #counts = 0;
  #tag = 0;
  #on = 0;
  /** Levels at the outputs' pins when they are idle: all low, until a rig says otherwise. */
  readonly #idle: number;
  readonly #decoder: FrameDecoder;

  /** @param idleHigh bit n: the rig configures output n to idle high */
  constructor(options: EmulatedBoardOptions = {}, idleHigh = 0) {
    this.board = new EmulatedBoard(options);
    this.#idle = idleHigh;
    this.#decoder = this.#makeDecoder();
    this.board.said = (bytes) => {
      this.bytes(bytes);
      this.#decoder.push(bytes);
    };
    this.board.advanceTo(BEGINNING_US);
  }

  get worldUs(): number {
    return this.board.worldUs - BEGINNING_US;
  }
  get boardUs(): number {
    return this.board.boardUs;
  }
  get tag(): number {
    return this.#tag;
  }
  get outputs(): number {
    return this.#on;
  }

  countsToSlot(): number {
    return NO_SLOT;
  }

  connect(output: BoardOutput): void {
    this.#output = output;
  }

  probe(probe: OutputProbe): void {
    const earlier = this.board.probe;
    this.board.probe = (output, level, cycle) => {
      earlier(output, level, cycle);
      const on = level !== ((this.#idle >> output) & 1);
      if (on) this.#on |= 1 << output;
      else this.#on &= ~(1 << output);
      probe(output, on, cycle / CYCLES_PER_US - BEGINNING_US);
    };
  }

  advanceTo(worldUs: number): void {
    const { board } = this;
    const untilUs = worldUs + BEGINNING_US;
    const counts = this.#counts;
    if (counts !== 0) {
      this.#counts = 0;
      const fromUs = board.worldUs;
      const steps = Math.abs(counts);
      for (let n = 1; n <= steps; n++) {
        board.advanceTo(fromUs + ((untilUs - fromUs) * n) / steps);
        board.step(counts > 0 ? 1 : -1);
      }
    }
    board.advanceTo(untilUs);
  }

  /** The belt has moved by so many counts by the time that `advanceTo` is called for next. */
  move(counts: number): void {
    this.#counts += counts;
  }

  setInput(input: number, level: 0 | 1): void {
    this.board.setInput(input, level);
  }

  receiveBytes(bytes: Uint8Array): void {
    this.board.receiveBytes(bytes);
  }

  reset(): void {
    this.#tag = 0;
    this.board.reset();
  }

  #makeDecoder(): FrameDecoder {
    const identity = blank('identity');
    const sample = blank('sample');
    const edge = blank('edge');
    const outcome = blank('outcome');
    const fault = blank('fault');
    const clock = blank('clock');
    return new FrameDecoder({
      frame: (frame) => {
        const { tag } = frame;
        this.#tag = tag;
        switch (frame.shape.name) {
          case 'identity':
            frame.read(identity);
            this.#output.identity(identity, tag);
            break;
          case 'sample':
            frame.read(sample);
            this.#output.sample(sample, tag);
            break;
          case 'edge':
            frame.read(edge);
            this.#output.edge(edge, tag);
            break;
          case 'outcome':
            frame.read(outcome);
            this.#output.outcome(outcome, tag);
            break;
          case 'fault':
            frame.read(fault);
            this.#output.fault(fault, tag);
            break;
          case 'clock':
            frame.read(clock);
            this.#output.clock(clock, tag);
            break;
        }
      },
      bad: () => {},
    });
  }
}
