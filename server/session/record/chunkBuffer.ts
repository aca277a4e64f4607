/**
 * MCAP records of the frame path, written by hand into one buffer that is used again and again.
 * The library's builders copy each chunk three times and make six big integers a message; the rest
 * of a file, written once, comes from them (`prelude.ts`).
 *
 * Record layout: https://mcap.dev/spec (little-endian; opcode u8, length u64, content).
 */
import { crc32 } from 'node:zlib';

const OPCODE_MESSAGE = 0x05;
const OPCODE_CHUNK = 0x06;
const RECORD_HEADER = 9;
/** channel u16, sequence u32, log time u64, publish time u64. */
const MESSAGE_HEADER = 22;
/** start, end, uncompressed size u64; crc u32; compression (empty text) u32; records length u64. */
const CHUNK_HEADER = 40;
/** Where the first record of the chunk goes. */
const HEAD = RECORD_HEADER + CHUNK_HEADER;
const TWO_32 = 0x1_0000_0000;

/** One uncompressed chunk, filled message by message. Times are microseconds since 1970. */
export class ChunkBuffer {
  messages = 0;
  #bytes = new Uint8Array(1 << 16);
  #view = new DataView(this.#bytes.buffer);
  #end = HEAD;
  #firstUs = 0;
  #lastUs = 0;

  /** Bytes the chunk takes in the file so far. */
  get length(): number {
    return this.#end;
  }

  add(channel: number, sequence: number, timeUs: number, data: Uint8Array): void {
    const size = data.length;
    const at = this.#end;
    this.#reserve(at + RECORD_HEADER + MESSAGE_HEADER + size);
    const view = this.#view;
    view.setUint8(at, OPCODE_MESSAGE);
    view.setUint32(at + 1, MESSAGE_HEADER + size, true);
    view.setUint32(at + 5, 0, true);
    view.setUint16(at + 9, channel, true);
    view.setUint32(at + 11, sequence, true);
    setNanoseconds(view, at + 15, timeUs);
    setNanoseconds(view, at + 23, timeUs);
    this.#bytes.set(data, at + RECORD_HEADER + MESSAGE_HEADER);
    this.#end = at + RECORD_HEADER + MESSAGE_HEADER + size;
    if (this.messages++ === 0) this.#firstUs = timeUs;
    this.#lastUs = timeUs;
  }

  /** Adds schema and channel records made elsewhere. */
  addRecords(records: Uint8Array): void {
    const at = this.#end;
    this.#reserve(at + records.length);
    this.#bytes.set(records, at);
    this.#end = at + records.length;
  }

  /** The chunk as bytes of the file: a view that the next `add` after `clear` overwrites. */
  finish(): Uint8Array {
    const view = this.#view;
    const size = this.#end - HEAD;
    view.setUint8(0, OPCODE_CHUNK);
    setWhole(view, 1, CHUNK_HEADER + size);
    setNanoseconds(view, 9, this.#firstUs);
    setNanoseconds(view, 17, this.#lastUs);
    setWhole(view, 25, size);
    view.setUint32(33, crc32(this.#bytes.subarray(HEAD, this.#end)), true);
    view.setUint32(37, 0, true);
    setWhole(view, 41, size);
    return this.#bytes.subarray(0, this.#end);
  }

  clear(): void {
    this.messages = 0;
    this.#end = HEAD;
    this.#firstUs = this.#lastUs = 0;
  }

  #reserve(size: number): void {
    if (size <= this.#bytes.length) return;
    const bytes = new Uint8Array(Math.max(size, this.#bytes.length * 2));
    bytes.set(this.#bytes);
    this.#bytes = bytes;
    this.#view = new DataView(bytes.buffer);
  }
}

function setWhole(view: DataView, at: number, value: number): void {
  view.setUint32(at, value % TWO_32, true);
  view.setUint32(at + 4, Math.floor(value / TWO_32), true);
}

/** Nanoseconds since 1970 are beyond 2^53, so they are made in two halves. */
function setNanoseconds(view: DataView, at: number, timeUs: number): void {
  const low = (timeUs % TWO_32) * 1000;
  const carry = Math.floor(low / TWO_32);
  view.setUint32(at, low - carry * TWO_32, true);
  view.setUint32(at + 4, Math.floor(timeUs / TWO_32) * 1000 + carry, true);
}

/** The reverse of `setNanoseconds`, to whole microseconds. */
export function readMicroseconds(view: DataView, at: number): number {
  const low = view.getUint32(at, true);
  const high = view.getUint32(at + 4, true);
  const whole = Math.floor(high / 1000);
  return whole * TWO_32 + Math.floor(((high - whole * 1000) * TWO_32 + low) / 1000);
}
