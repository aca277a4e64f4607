import { FrameEncoder } from '../../server/wire/codec.js';
import type { Clock, Edge, Fault, Identity, Outcome, Sample } from '../../server/wire/messages.js';

/**
 * Where a board's words go. Each kind of message is one object that the board uses again: take what
 * is needed before returning. A receiver may call `Board.receive` from inside; the board acts on it
 * as soon as the event at hand is finished, at the same board time.
 */
export interface BoardOutput {
  identity(message: Identity, tag: number): void;
  sample(message: Sample, tag: number): void;
  edge(message: Edge, tag: number): void;
  outcome(message: Outcome, tag: number): void;
  fault(message: Fault, tag: number): void;
  clock(message: Clock, tag: number): void;
}

/** Turns the board's words into bytes; `write` must take the bytes before it returns. */
export class FramedOutput implements BoardOutput {
  readonly #encoder = new FrameEncoder();
  readonly #write: (bytes: Uint8Array) => void;

  constructor(write: (bytes: Uint8Array) => void) {
    this.#write = write;
  }

  identity(message: Identity, tag: number): void {
    // Identity begins a connection: its sequence number is 0.
    this.#encoder.restart();
    this.#write(this.#encoder.encode('identity', message, tag));
  }
  sample(message: Sample, tag: number): void {
    this.#write(this.#encoder.encode('sample', message, tag));
  }
  edge(message: Edge, tag: number): void {
    this.#write(this.#encoder.encode('edge', message, tag));
  }
  outcome(message: Outcome, tag: number): void {
    this.#write(this.#encoder.encode('outcome', message, tag));
  }
  fault(message: Fault, tag: number): void {
    this.#write(this.#encoder.encode('fault', message, tag));
  }
  clock(message: Clock, tag: number): void {
    this.#write(this.#encoder.encode('clock', message, tag));
  }
}

/** Nobody listens: a board before anything is connected. */
export class NoOutput implements BoardOutput {
  identity(): void {}
  sample(): void {}
  edge(): void {}
  outcome(): void {}
  fault(): void {}
  clock(): void {}
}
