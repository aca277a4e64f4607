import { cobsBound, cobsEncode } from './cobs.js';
import { crc16 } from './crc16.js';
import {
  CRC_BYTES,
  FIELD_BYTES,
  type FieldType,
  HEADER_BYTES,
  MAX_FRAME_BYTES,
  MESSAGES,
  type MessageName,
  type MessageOf,
  type Sample,
} from './messages.js';

interface Field {
  readonly name: string;
  readonly type: FieldType;
  readonly offset: number;
}
export interface Shape {
  readonly name: MessageName;
  readonly type: number;
  readonly fields: readonly Field[];
  readonly payloadBytes: number;
}

function shapeOf(name: MessageName): Shape {
  const spec = MESSAGES[name];
  const fields: Field[] = [];
  let offset = 0;
  for (const [field, type] of Object.entries(spec.fields) as [string, FieldType][]) {
    fields.push({ name: field, type, offset });
    offset += FIELD_BYTES[type];
  }
  return { name, type: spec.type, fields, payloadBytes: offset };
}

export const SHAPES = Object.fromEntries(
  (Object.keys(MESSAGES) as MessageName[]).map((name) => [name, shapeOf(name)]),
) as { readonly [N in MessageName]: Shape };

/** Shapes by type byte; a hole is an unknown type. */
export const SHAPE_BY_TYPE: (Shape | undefined)[] = new Array(256).fill(undefined);
for (const shape of Object.values(SHAPES)) SHAPE_BY_TYPE[shape.type] = shape;

/**
 * The one message that comes a thousand times a second. Its time is a double from the beginning, so
 * that a time above 2^31 is stored in place; made field by field as the others are, every sample
 * would leave 16 bytes of garbage (measured).
 */
class BlankSample implements Sample {
  boardUs = 0.5;
  count = 0;
  inputs = 0;
  outputs = 0;
  illegal = 0;
  badFrames = 0;
  overruns = 0;
}

/** A message of this kind with every field at zero, to decode into again and again. */
export function blank<N extends MessageName>(name: N): MessageOf[N] {
  if (name === 'sample') {
    const sample = new BlankSample();
    sample.boardUs = 0;
    return sample as unknown as MessageOf[N];
  }
  const message: Record<string, number | string> = {};
  for (const field of SHAPES[name].fields) message[field.name] = field.type === 'text16' ? '' : 0;
  return message as unknown as MessageOf[N];
}

/** Reads a payload at `offset` of `view` into `into`; no allocation but for text. */
export function readPayload(shape: Shape, view: DataView, offset: number, into: object): void {
  if (shape.type === MESSAGES.sample.type) {
    readSample(view, offset, into as Sample);
    return;
  }
  const target = into as Record<string, number | string>;
  const { fields } = shape;
  for (let i = 0; i < fields.length; i++) {
    const field = fields[i]!;
    const at = offset + field.offset;
    switch (field.type) {
      case 'u8':
        target[field.name] = view.getUint8(at);
        break;
      case 'u16':
        target[field.name] = view.getUint16(at, true);
        break;
      case 'u32':
        target[field.name] = view.getUint32(at, true);
        break;
      case 'i32':
        target[field.name] = view.getInt32(at, true);
        break;
      case 'text16':
        target[field.name] = readText(view, at);
        break;
    }
  }
}

/** Written out, as `BlankSample` is and for the same reason; a test holds both to the table. */
function readSample(view: DataView, offset: number, into: Sample): void {
  into.boardUs = view.getUint32(offset, true);
  into.count = view.getInt32(offset + 4, true);
  into.inputs = view.getUint16(offset + 8, true);
  into.outputs = view.getUint16(offset + 10, true);
  into.illegal = view.getUint16(offset + 12, true);
  into.badFrames = view.getUint8(offset + 14);
  into.overruns = view.getUint8(offset + 15);
}

/** Writes a payload; numbers are taken modulo their width, so extended time may be passed as is. */
export function writePayload(shape: Shape, view: DataView, offset: number, message: object): void {
  const source = message as Record<string, number | string>;
  const { fields } = shape;
  for (let i = 0; i < fields.length; i++) {
    const field = fields[i]!;
    const at = offset + field.offset;
    const value = source[field.name];
    switch (field.type) {
      case 'u8':
        view.setUint8(at, value as number);
        break;
      case 'u16':
        view.setUint16(at, value as number, true);
        break;
      case 'u32':
        view.setUint32(at, value as number, true);
        break;
      case 'i32':
        view.setInt32(at, value as number, true);
        break;
      case 'text16':
        writeText(view, at, value as string);
        break;
    }
  }
}

function readText(view: DataView, at: number): string {
  let text = '';
  for (let i = 0; i < FIELD_BYTES.text16; i++) {
    const byte = view.getUint8(at + i);
    if (byte === 0) break;
    text += byte >= 0x20 && byte < 0x7f ? String.fromCharCode(byte) : '?';
  }
  return text;
}

function writeText(view: DataView, at: number, text: string): void {
  for (let i = 0; i < FIELD_BYTES.text16; i++) {
    const code = i < text.length ? text.charCodeAt(i) : 0;
    view.setUint8(at + i, code < 0x80 ? code : 0x3f);
  }
}

/** Frames messages into one reusable buffer. */
export class FrameEncoder {
  readonly #raw = new Uint8Array(MAX_FRAME_BYTES);
  readonly #view = new DataView(this.#raw.buffer);
  readonly #stuffed = new Uint8Array(cobsBound(MAX_FRAME_BYTES) + 1);
  #sequence = 0;

  /**
   * The bytes of one frame, its closing delimiter included, under connection `tag`.
   * The result is a view that the next call overwrites.
   */
  encode<N extends MessageName>(name: N, message: MessageOf[N], tag: number): Uint8Array {
    const shape = SHAPES[name];
    this.#view.setUint8(0, shape.type);
    this.#view.setUint8(1, this.#sequence);
    this.#view.setUint16(2, tag, true);
    writePayload(shape, this.#view, HEADER_BYTES, message);
    const crcAt = HEADER_BYTES + shape.payloadBytes;
    this.#view.setUint16(crcAt, crc16(this.#raw, 0, crcAt), true);
    this.#sequence = (this.#sequence + 1) & 0xff;
    const end = cobsEncode(this.#raw, crcAt + CRC_BYTES, this.#stuffed);
    this.#stuffed[end] = 0;
    return this.#stuffed.subarray(0, end + 1);
  }

  /** Begins a new connection: the next frame has sequence number 0. */
  restart(): void {
    this.#sequence = 0;
  }
}
