import type { LapwingError } from '../errors/codes.js';
import type { Clock, Edge, Fault, Identity, Outcome, Sample } from '../wire/messages.js';
import type { Transport } from './bytePort.js';

/** What is known once a board has answered. */
export interface LinkUp {
  readonly identity: Identity;
  /** The tag that every frame of this connection carries. */
  readonly tag: number;
  readonly port: string;
  readonly transport: Transport;
  /** The board as it was when last connected; undefined the first time. */
  readonly previous: Identity | undefined;
  /** The same unit (number and model) as before. */
  readonly sameBoard: boolean;
  /** The same unit, and it has not been reset since: its count and outcomes go on. */
  readonly sameBoot: boolean;
}

/**
 * Told everything that a board says, in wire order. Messages are reused: each is overwritten by
 * the next of its kind. `send` may be called from inside any of these.
 */
export interface LinkHandler {
  sample(message: Sample): void;
  edge(message: Edge): void;
  outcome(message: Outcome): void;
  fault(message: Fault): void;
  clock(message: Clock): void;
  /** A connection begins; the outcomes that the board kept follow. */
  up(event: LinkUp): void;
  /** The connection that was up has ended; told once for each `up`, never from inside `send`. */
  down(why: LapwingError): void;
  /** An attempt to connect failed; the next one comes in `retryMs`. */
  waiting(why: LapwingError, retryMs: number): void;
  /** So many frames (modulo 256) are missing before the one that follows. */
  gap(frames: number): void;
  /** Bytes came that are no frame. */
  badFrame(why: string): void;
  /** Everything that came at once has been handed on: the time to write and flush. */
  batchEnd(): void;
}

export interface LinkCounters {
  bytes: number;
  /** Good frames, under whatever tag. */
  frames: number;
  /** Good frames dropped because they carry another tag. */
  foreign: number;
  /** Frames that the sequence numbers say were lost. */
  lost: number;
  bad: number;
  /** Times that a board has answered. */
  connections: number;
}
