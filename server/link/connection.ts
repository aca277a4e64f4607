import type { LapwingError } from '../errors/codes.js';
import { blank, FrameEncoder } from '../wire/codec.js';
import { type BadFrame, type Frame, FrameDecoder } from '../wire/frameDecoder.js';
import {
  FAULT,
  type Fault,
  type HostMessageName,
  type Identity,
  MESSAGES,
  type MessageOf,
  PROTOCOL_VERSION,
} from '../wire/messages.js';
import type { BytePort, PortListener } from './bytePort.js';
import type { LinkCounters, LinkHandler } from './linkHandler.js';

const DELIMITER = Uint8Array.of(0);

/** What a connection tells the link that owns it. */
export interface ConnectionOwner {
  readonly handler: LinkHandler;
  readonly counters: LinkCounters;
  /** An identity came, under whatever tag: the nonce says whether it answers us. */
  identity(message: Identity): void;
  /** A fault came before the handshake was done. */
  earlyFault(message: Fault): void;
  /** The board has left the connection: it said so, or sent a frame without a tag. */
  tagEnded(): void;
  /** At least one good frame under the tag came in what was just handed on. */
  heard(): void;
  portClosed(why: LapwingError): void;
}

/**
 * One open port: bytes in, messages of the current tag out. It has a decoder and an encoder of its
 * own and belongs to one port for life, so that no half frame or late byte of an old port can reach
 * the next.
 */
export class Connection implements PortListener {
  readonly port: BytePort;
  readonly #owner: ConnectionOwner;
  readonly #encoder = new FrameEncoder();
  readonly #decoder: FrameDecoder;
  readonly #sample = blank('sample');
  readonly #edge = blank('edge');
  readonly #outcome = blank('outcome');
  readonly #fault = blank('fault');
  readonly #clock = blank('clock');
  #tag = 0;
  #up = false;
  #over = false;
  #sequence = 0;
  #heard = false;

  constructor(port: BytePort, owner: ConnectionOwner) {
    this.port = port;
    this.#owner = owner;
    this.#decoder = new FrameDecoder({
      frame: (frame) => this.#frame(frame),
      bad: (why) => this.#bad(why),
      otherLength: (frame) => this.#otherLength(frame),
    });
    port.listen(this);
  }

  /** Asks the board who it is, under a new tag. False: the port did not take it. */
  identify(message: MessageOf['identify']): boolean {
    this.#up = false;
    this.#tag = message.newTag;
    this.#encoder.restart();
    return this.port.write(DELIMITER) && this.send('identify', message);
  }

  /** The board has answered: frames under the tag are handed on from here. */
  begin(): void {
    this.#up = true;
  }

  /** Hands nothing on any more, whatever may still come. */
  end(): void {
    this.#over = true;
    this.#up = false;
  }

  send<N extends HostMessageName>(name: N, message: MessageOf[N]): boolean {
    return !this.#over && this.port.write(this.#encoder.encode(name, message, this.#tag));
  }

  bytes(bytes: Uint8Array): void {
    if (this.#over) return;
    this.#owner.counters.bytes += bytes.length;
    this.#heard = false;
    this.#decoder.push(bytes);
    if (this.#heard) this.#owner.heard();
    this.#owner.handler.batchEnd();
  }

  closed(why: LapwingError): void {
    if (!this.#over) this.#owner.portClosed(why);
  }

  #frame(frame: Frame): void {
    if (this.#over) return;
    const { handler, counters } = this.#owner;
    counters.frames++;
    const { type } = frame.shape;
    if (type === MESSAGES.identity.type) {
      this.#identity(frame);
      return;
    }
    if (!this.#up || frame.tag !== this.#tag) {
      this.#foreign(frame);
      return;
    }
    this.#heard = true;
    const missing = (frame.sequence - this.#sequence - 1) & 0xff;
    this.#sequence = frame.sequence;
    if (missing !== 0) {
      counters.lost += missing;
      handler.gap(missing);
    }
    switch (type) {
      case MESSAGES.sample.type:
        frame.read(this.#sample);
        handler.sample(this.#sample);
        break;
      case MESSAGES.edge.type:
        frame.read(this.#edge);
        handler.edge(this.#edge);
        break;
      case MESSAGES.outcome.type:
        frame.read(this.#outcome);
        handler.outcome(this.#outcome);
        break;
      case MESSAGES.fault.type:
        frame.read(this.#fault);
        handler.fault(this.#fault);
        // Its last word under this tag.
        if (this.#fault.fault === FAULT.watchdogOutputs) this.#owner.tagEnded();
        break;
      case MESSAGES.clock.type:
        frame.read(this.#clock);
        handler.clock(this.#clock);
        break;
      default:
        // A message that only hosts send: an echo, or two hosts on one line.
        counters.foreign++;
    }
  }

  #identity(frame: Frame): void {
    // A board that has been reset speaks first, under no tag.
    if (this.#up && frame.tag === 0) {
      this.#owner.tagEnded();
      return;
    }
    this.#sequence = frame.sequence;
    const identity = blank('identity');
    frame.read(identity);
    this.#owner.identity(identity);
  }

  /** A frame that is not of this connection; only what it says about the connection matters. */
  #foreign(frame: Frame): void {
    this.#owner.counters.foreign++;
    const isFault = frame.shape.type === MESSAGES.fault.type;
    if (!this.#up) {
      if (isFault) {
        frame.read(this.#fault);
        this.#owner.earlyFault(this.#fault);
      }
      return;
    }
    if (frame.tag !== 0) return;
    // The reason for the end, if the board says one, belongs into the record before the end.
    if (isFault) {
      frame.read(this.#fault);
      this.#owner.handler.fault(this.#fault);
    }
    this.#owner.tagEnded();
  }

  /** Another version's identity begins like ours, and so can say which version it is. */
  #otherLength(frame: Frame): void {
    if (this.#over || frame.shape.type !== MESSAGES.identity.type) return;
    const identity = blank('identity');
    identity.nonce = frame.u32(0);
    identity.protocol = frame.u8(4);
    if (identity.protocol !== PROTOCOL_VERSION) this.#owner.identity(identity);
  }

  #bad(why: BadFrame): void {
    if (this.#over) return;
    this.#owner.counters.bad++;
    if (this.#up) this.#owner.handler.badFrame(why);
  }
}
