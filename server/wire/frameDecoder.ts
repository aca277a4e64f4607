import { cobsBound, cobsDecodeInPlace } from './cobs.js';
import { readPayload, SHAPE_BY_TYPE, type Shape } from './codec.js';
import { crc16 } from './crc16.js';
import { CRC_BYTES, HEADER_BYTES, MAX_FRAME_BYTES } from './messages.js';

/** Why a frame was dropped. */
export type BadFrame = 'too long' | 'too short' | 'stuffing' | 'crc' | 'unknown type' | 'length';

export interface FrameSink {
  /** A whole frame with a good CRC. `frame` is reused: take what is needed before returning. */
  frame(frame: Frame): void;
  /** Bytes between two delimiters that are no frame; decoding goes on at the next one. */
  bad(why: BadFrame): void;
  /**
   * A frame with a good CRC and a known type whose payload is longer or shorter than this version's:
   * `bad('length')` follows. Only fields that no version moves may be read, by `u8` and `u32`.
   */
  otherLength?(frame: Frame): void;
}

/** One decoded frame; a single instance is reused for every frame of a decoder. */
export class Frame {
  shape!: Shape;
  sequence = 0;
  tag = 0;
  readonly #view: DataView;

  constructor(view: DataView) {
    this.#view = view;
  }

  /** Reads the payload into a message made by `blank(frame.shape.name)`. */
  read(into: object): void {
    readPayload(this.shape, this.#view, HEADER_BYTES, into);
  }

  /** One byte of the payload. */
  u8(offset: number): number {
    return this.#view.getUint8(HEADER_BYTES + offset);
  }

  /** Four bytes of the payload. */
  u32(offset: number): number {
    return this.#view.getUint32(HEADER_BYTES + offset, true);
  }
}

const STUFFED_MOST = cobsBound(MAX_FRAME_BYTES);

/**
 * Bytes in, in fragments of any size; frames out. One buffer, nothing allocated per byte or frame.
 */
export class FrameDecoder {
  readonly #buffer = new Uint8Array(STUFFED_MOST);
  readonly #frame: Frame;
  readonly #view: DataView;
  readonly #sink: FrameSink;
  #length = 0;
  #overlong = false;

  constructor(sink: FrameSink) {
    this.#sink = sink;
    this.#view = new DataView(this.#buffer.buffer);
    this.#frame = new Frame(this.#view);
  }

  push(bytes: Uint8Array): void {
    const buffer = this.#buffer;
    let length = this.#length;
    for (let i = 0; i < bytes.length; i++) {
      const byte = bytes[i]!;
      if (byte !== 0) {
        if (length < STUFFED_MOST) buffer[length++] = byte;
        else this.#overlong = true;
        continue;
      }
      // An empty frame is a delimiter sent to begin a connection, not an error.
      if (length > 0) {
        this.#length = 0;
        this.#end(length);
        length = 0;
      }
    }
    this.#length = length;
  }

  /** Forgets a half frame: for a new connection. */
  reset(): void {
    this.#length = 0;
    this.#overlong = false;
  }

  #end(stuffedLength: number): void {
    const why = this.#check(stuffedLength);
    if (why === undefined) this.#sink.frame(this.#frame);
    else this.#sink.bad(why);
  }

  /** Unstuffs and checks what lies in the buffer, and fills the frame if nothing is wrong. */
  #check(stuffedLength: number): BadFrame | undefined {
    if (this.#overlong) {
      this.#overlong = false;
      return 'too long';
    }
    const length = cobsDecodeInPlace(this.#buffer, stuffedLength);
    if (length < 0) return 'stuffing';
    if (length < HEADER_BYTES + CRC_BYTES) return 'too short';
    const crcAt = length - CRC_BYTES;
    const view = this.#view;
    if (view.getUint16(crcAt, true) !== crc16(this.#buffer, 0, crcAt)) return 'crc';
    const shape = SHAPE_BY_TYPE[this.#buffer[0]!];
    if (shape === undefined) return 'unknown type';
    this.#frame.shape = shape;
    this.#frame.sequence = this.#buffer[1]!;
    this.#frame.tag = view.getUint16(2, true);
    if (shape.payloadBytes === crcAt - HEADER_BYTES) return undefined;
    this.#sink.otherLength?.(this.#frame);
    return 'length';
  }
}
