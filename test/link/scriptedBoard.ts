import { blank, FrameEncoder } from '../../server/wire/codec.js';
import { FrameDecoder } from '../../server/wire/frameDecoder.js';
import {
  type BoardMessageName,
  FAULT,
  type Identity,
  type MessageName,
  type MessageOf,
  PROTOCOL_VERSION,
} from '../../server/wire/messages.js';

/**
 * The least that a link needs to talk to: answers `identify`, keeps what it is sent, and says what
 * the test tells it to say.
 */
export class ScriptedBoard {
  readonly received: { name: MessageName; tag: number; message: object }[] = [];
  readonly identity: Identity = {
    ...blank('identity'),
    protocol: PROTOCOL_VERSION,
    firmware: 1,
    bootId: 0xb007,
    boardId: 77,
    model: 'scripted',
  };
  /** Commands under another tag than the current one, as a board would refuse them. */
  readonly stale: MessageName[] = [];
  answers = true;
  tag = 0;
  onMessage: (name: MessageName) => void = () => {};
  readonly #encoder = new FrameEncoder();
  readonly #decoder: FrameDecoder;
  /** Where its bytes go; taken before it returns. */
  write: (bytes: Uint8Array) => void;

  constructor(write: (bytes: Uint8Array) => void = () => {}) {
    this.write = write;
    this.#decoder = new FrameDecoder({
      frame: (frame) => {
        const { name } = frame.shape;
        const message = blank(name);
        frame.read(message);
        this.received.push({ name, tag: frame.tag, message });
        if (name === 'identify') this.#identify(message as MessageOf['identify']);
        else if (frame.tag !== this.tag) this.stale.push(name);
        this.onMessage(name);
      },
      bad: () => {},
    });
  }

  of(name: MessageName): object[] {
    return this.received.filter((item) => item.name === name).map((item) => item.message);
  }

  receive(bytes: Uint8Array): void {
    this.#decoder.push(bytes);
  }

  bytesOf<N extends BoardMessageName>(name: N, message: Partial<MessageOf[N]> = {}): Uint8Array {
    return this.#encoder.encode(name, { ...blank(name), ...message }, this.tag).slice();
  }

  say<N extends BoardMessageName>(name: N, message: Partial<MessageOf[N]> = {}): void {
    this.write(this.bytesOf(name, message));
  }

  /** Uses up a sequence number as a frame lost on the way would. */
  loseOne(): void {
    this.bytesOf('clock');
  }

  /** Back from reset, under no tag. */
  reset(bootId = this.identity.bootId + 1): void {
    this.identity.bootId = bootId;
    this.tag = 0;
    this.#encoder.restart();
  }

  watchdog(): void {
    this.tag = 0;
    this.say('fault', { fault: FAULT.watchdogOutputs });
  }

  #identify(message: MessageOf['identify']): void {
    if (!this.answers) return;
    this.identity.nonce = message.nonce;
    this.identity.previousTag = this.tag;
    this.tag = message.newTag;
    this.#encoder.restart();
    this.say('identity', this.identity);
  }
}
