import { randomBytes } from 'node:crypto';
import { LapwingError } from '../errors/codes.js';
import {
  FAULT,
  type Fault,
  type HostMessageName,
  type Identity,
  type MessageOf,
  PROTOCOL_VERSION,
} from '../wire/messages.js';
import { BackOff } from './backOff.js';
import type { BytePort, OpenPort, Transport } from './bytePort.js';
import { Connection, type ConnectionOwner } from './connection.js';
import type { LinkCounters, LinkHandler } from './linkHandler.js';
import { hostTimers, type Timer, type Timers } from './timers.js';

/** A board sends at least every 5 ms; after this long without a good frame the link is lost. */
export const SILENCE_MS = 250;
/** The silence may be our own (a suspended host): what waits in the kernel gets this long. */
export const GRACE_MS = 20;
/** `identify` is sent again after this long, and given up after `ANSWER_MS`. */
export const IDENTIFY_MS = 250;
/** Long enough for a board whose boot loader runs first when its port is opened. */
export const ANSWER_MS = 3_000;

export type LinkState = 'down' | 'connecting' | 'up';

export interface LinkOptions {
  /** Finds and opens the port anew for each connection. */
  readonly openPort: OpenPort;
  readonly handler: LinkHandler;
  readonly timers?: Timers;
  /** A random 32-bit number, for tags and nonces. */
  readonly random?: () => number;
  /** The one board that may answer; any if absent. */
  readonly boardId?: number;
}

/**
 * A board as a stream of messages: connects, shakes hands, notices when the link is lost (silence,
 * a closed port, a failed write, a tag that the board has ended) and connects again, for ever.
 */
export class BoardLink {
  readonly counters: LinkCounters = {
    bytes: 0,
    frames: 0,
    foreign: 0,
    lost: 0,
    bad: 0,
    connections: 0,
  };
  readonly handler: LinkHandler;
  readonly #openPort: OpenPort;
  readonly #timers: Timers;
  readonly #random: () => number;
  readonly #boardId: number | undefined;
  readonly #owner: ConnectionOwner;
  readonly #backOff = new BackOff();
  #state: LinkState = 'down';
  #trouble: LapwingError | undefined;
  #connection: Connection | undefined;
  #identity: Identity | undefined;
  #tag = 0;
  #nonce = 0;
  /** The one timer: identify again, look for silence, or connect again. */
  #timer: Timer | undefined;
  #answerBy = 0;
  #bytesBefore = 0;
  #framesBefore = 0;
  #heardMs = 0;
  #running = false;
  #closed = false;
  #attempt: Promise<void> = Promise.resolve();
  #closing: Promise<void> = Promise.resolve();

  constructor(options: LinkOptions) {
    this.handler = options.handler;
    this.#openPort = options.openPort;
    this.#timers = options.timers ?? hostTimers;
    this.#random = options.random ?? (() => randomBytes(4).readUInt32LE());
    this.#boardId = options.boardId;
    this.#owner = {
      handler: this.handler,
      counters: this.counters,
      identity: (message) => this.#answered(message),
      earlyFault: (message) => this.#earlyFault(message),
      tagEnded: () => this.#tagEnded(),
      heard: () => {
        this.#heardMs = this.#timers.now();
      },
      portClosed: (why) => this.#lose(why),
    };
  }

  get state(): LinkState {
    return this.#state;
  }
  /** Why it is not up, or why it last was not; undefined before anything went wrong. */
  get trouble(): LapwingError | undefined {
    return this.#trouble;
  }
  /** The board that answered last. */
  get identity(): Identity | undefined {
    return this.#identity;
  }
  /** The open port's name; undefined while there is none. */
  get port(): string | undefined {
    return this.#connection?.port.name;
  }
  get transport(): Transport | undefined {
    return this.#connection?.port.transport;
  }

  /** The board as the record of a resumed session knows it; before `start`. */
  remember(identity: Identity): void {
    this.#identity = identity;
  }

  start(): void {
    if (this.#running || this.#closed) return;
    this.#running = true;
    this.#connect();
  }

  /** Ends the link for good, without a word to the board. The handler is told nothing more. */
  async close(): Promise<void> {
    this.#running = false;
    this.#closed = true;
    this.#leavePort();
    await this.#attempt;
    await this.#closing;
  }

  /**
   * Sends at once under the current tag. False, and nothing is ever sent of it, when the link is
   * not up or the port does not take all of it; the latter ends the link, which the handler hears
   * after the caller has returned.
   */
  send<N extends HostMessageName>(name: N, message: MessageOf[N]): boolean {
    if (this.#state !== 'up') return false;
    if (this.#connection!.send(name, message)) return true;
    const why = new LapwingError('linkWriteFailed', `${this.port} did not take a whole ${name}.`);
    this.#leavePort();
    this.#set(0, () => this.#retry(why, true));
    return false;
  }

  // ---- connecting ----------------------------------------------------------------------------

  #connect(): void {
    this.#state = 'connecting';
    // The old port must have let go of the device before it is opened again.
    this.#attempt = this.#closing.then(this.#openPort).then(
      (port) => this.#opened(port),
      (error) => {
        if (this.#running) this.#retry(asLapwing(error), false);
      },
    );
  }

  #opened(port: BytePort): void {
    if (!this.#running) {
      this.#closing = port.close();
      return;
    }
    this.#bytesBefore = this.counters.bytes;
    this.#framesBefore = this.counters.frames;
    this.#connection = new Connection(port, this.#owner);
    this.#shakeHands();
  }

  /** Begins a handshake on the open port. */
  #shakeHands(): void {
    this.#state = 'connecting';
    this.#answerBy = this.#timers.now() + ANSWER_MS;
    this.#identify();
  }

  #identify(): void {
    this.#nonce = this.#random() >>> 0 || 1;
    const before = this.#tag;
    do this.#tag = this.#random() & 0xffff;
    while (this.#tag === 0 || this.#tag === before);
    const asked = { nonce: this.#nonce, protocol: PROTOCOL_VERSION, newTag: this.#tag };
    if (!this.#connection!.identify(asked)) {
      const why = new LapwingError('linkWriteFailed', `${this.port} takes no bytes.`);
      this.#lose(why);
      return;
    }
    this.#set(IDENTIFY_MS, () => {
      if (this.#timers.now() < this.#answerBy) this.#identify();
      else this.#lose(this.#noAnswer());
    });
  }

  #noAnswer(): LapwingError {
    const bytes = this.counters.bytes - this.#bytesBefore;
    const frames = this.counters.frames - this.#framesBefore;
    const heard =
      bytes === 0
        ? 'not a byte came'
        : frames === 0
          ? `${bytes} bytes came, and no frame among them`
          : `${frames} frames came, but no identity`;
    const seconds = ANSWER_MS / 1000;
    return new LapwingError('linkNoAnswer', `${this.port}: ${heard} in ${seconds} s.`);
  }

  #answered(message: Identity): void {
    if (this.#state === 'up') return;
    if (message.nonce !== this.#nonce) {
      // A board that has just started and did not hear us: ask it now.
      if (message.nonce === 0) this.#identify();
      return;
    }
    if (message.protocol !== PROTOCOL_VERSION) {
      this.#lose(protocolError(message.protocol, message.model));
      return;
    }
    if (this.#boardId !== undefined && message.boardId !== this.#boardId) {
      const text = `Board ${message.boardId} (${message.model}) answered; the rig file wants board ${this.#boardId}.`;
      this.#lose(new LapwingError('linkOtherBoard', text));
      return;
    }
    this.#up(message);
  }

  #up(identity: Identity): void {
    const previous = this.#identity;
    const sameBoard =
      previous !== undefined &&
      previous.boardId === identity.boardId &&
      previous.model === identity.model;
    const { port } = this.#connection!;
    this.#identity = identity;
    this.#state = 'up';
    this.#trouble = undefined;
    this.#backOff.reset();
    this.counters.connections++;
    this.#heardMs = this.#timers.now();
    this.#connection!.begin();
    this.#set(SILENCE_MS, () => this.#lookForSilence(false));
    this.handler.up({
      identity,
      tag: this.#tag,
      port: port.name,
      transport: port.transport,
      previous,
      sameBoard,
      sameBoot: sameBoard && previous.bootId === identity.bootId,
    });
  }

  // ---- losing it -----------------------------------------------------------------------------

  #earlyFault(message: Fault): void {
    if (message.fault !== FAULT.badProtocol) return;
    // An identity that names its version comes first, unless that one was lost.
    const text = `The board refuses protocol ${PROTOCOL_VERSION}, which this Lapwing speaks.`;
    this.#lose(new LapwingError('linkProtocol', text));
  }

  /** The board goes on without a tag: it was reset, or its watchdog has tripped. */
  #tagEnded(): void {
    const why = new LapwingError('linkTagEnded', `The board at ${this.port} ended the connection.`);
    this.#state = 'connecting';
    this.#trouble = why;
    this.#clearTimer();
    this.handler.down(why);
    if (this.#connection !== undefined) this.#shakeHands();
  }

  #lookForSilence(graceGiven: boolean): void {
    const silentMs = this.#timers.now() - this.#heardMs;
    if (silentMs < SILENCE_MS) {
      this.#set(SILENCE_MS - silentMs, () => this.#lookForSilence(false));
    } else if (!graceGiven) {
      this.#set(GRACE_MS, () => this.#lookForSilence(true));
    } else {
      const text = `No good frame came from ${this.port} for ${Math.round(silentMs)} ms.`;
      this.#lose(new LapwingError('linkSilent', text));
    }
  }

  #lose(why: LapwingError): void {
    const wasUp = this.#state === 'up';
    this.#leavePort();
    this.#retry(why, wasUp);
  }

  /** Lets go of the port; from here on nothing is sent or handed on. */
  #leavePort(): void {
    this.#state = 'down';
    this.#clearTimer();
    const connection = this.#connection;
    if (connection === undefined) return;
    this.#connection = undefined;
    connection.end();
    this.#closing = connection.port.close();
  }

  #retry(why: LapwingError, wasUp: boolean): void {
    this.#state = 'down';
    this.#trouble = why;
    const retryMs = this.#backOff.next();
    this.#set(retryMs, () => this.#connect());
    if (wasUp) this.handler.down(why);
    else this.handler.waiting(why, retryMs);
  }

  #set(delayMs: number, task: () => void): void {
    this.#clearTimer();
    this.#timer = this.#timers.set(delayMs, task);
  }

  #clearTimer(): void {
    if (this.#timer !== undefined) this.#timers.clear(this.#timer);
    this.#timer = undefined;
  }
}

function asLapwing(error: unknown): LapwingError {
  if (error instanceof LapwingError) return error;
  return new LapwingError('linkOpenFailed', String(error), { cause: error });
}

function protocolError(board: number, model: string): LapwingError {
  const text = `The board${model === '' ? '' : ` (${model})`} speaks protocol ${board}; this Lapwing speaks ${PROTOCOL_VERSION}.`;
  return new LapwingError('linkProtocol', text);
}
