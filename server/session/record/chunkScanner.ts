import fs from 'node:fs';
import { crc32 } from 'node:zlib';
import { LapwingError } from '../../errors/codes.js';
import { readMicroseconds } from './chunkBuffer.js';

/** Decompresses the records of a chunk; throws where they are not what their compression says. */
export type Decompress = (compressed: Uint8Array, size: number) => Uint8Array;

export interface ChunkSink {
  /** The records of a whole chunk whose CRC is right. The bytes are reused after the call. */
  chunk(records: Uint8Array, view: DataView): void;
  /** Bytes that are no chunk; `fromUs` and `toUs` as the chunk's own header has them, if it can. */
  damaged(bytes: number, fromUs: number | null, toUs: number | null): void;
}

/** How a file ended. */
export type Ending = { readonly kind: 'closed' | 'open' } | { kind: 'torn'; bytesLost: number };

const MAGIC = [0x89, 0x4d, 0x43, 0x41, 0x50, 0x30, 0x0d, 0x0a];
const OPCODE = { header: 0x01, chunk: 0x06, messageIndex: 0x07, dataEnd: 0x0f };
const RECORD_HEADER = 9;
/** Data end, footer and magic of a file without a summary. */
const CLOSING_BYTES = 13 + 29 + MAGIC.length;
const CHUNK_HEADER = 40;
/** No chunk, compressed or not, that was ever written is near this. */
const CHUNK_MOST = 1 << 28;
const HEADER_MOST = 1024;
const WINDOW = 1 << 22;

/**
 * Finds the chunks of an MCAP file from its start, without its index, and gets over whatever is
 * damaged: after bytes that make no sense it looks for the next place where a whole chunk stands.
 */
export class ChunkScanner {
  readonly #fd: number;
  readonly #size: number;
  readonly #decompress: Decompress;
  #window: Buffer;
  #windowAt = 0;
  #windowEnd = 0;

  constructor(path: string, decompress: Decompress) {
    this.#fd = fs.openSync(path, 'r');
    this.#size = fs.fstatSync(this.#fd).size;
    this.#window = Buffer.allocUnsafe(Math.min(WINDOW, this.#size));
    this.#decompress = decompress;
  }

  get size(): number {
    return this.#size;
  }

  close(): void {
    fs.closeSync(this.#fd);
  }

  /** Hands over every chunk of the file in order, and says how the file ended. */
  scan(sink: ChunkSink): Ending {
    if (this.#size < MAGIC.length) return { kind: 'torn', bytesLost: this.#size };
    const magic = this.#bytes(0, MAGIC.length);
    if (!MAGIC.every((byte, i) => magic[i] === byte)) sink.damaged(MAGIC.length, null, null);
    let at = MAGIC.length;
    while (at < this.#size) {
      const next = this.#record(at, sink);
      if (next === 'end') return this.#end(at, sink);
      if (next !== undefined) {
        at = next;
        continue;
      }
      const found = this.#nextChunk(at + 1);
      if (found === undefined) return this.#lost(at, sink);
      this.#report(at, found - at, sink);
      at = found;
    }
    return { kind: 'open' };
  }

  /** Handles the record at `at` and returns where the next begins; undefined if it makes no sense. */
  #record(at: number, sink: ChunkSink): number | 'end' | undefined {
    const left = this.#size - at;
    if (left < RECORD_HEADER) return undefined;
    const head = this.#bytes(at, RECORD_HEADER);
    const opcode = head[0]!;
    const length = head.readUInt32LE(1) + head.readUInt32LE(5) * 0x1_0000_0000;
    if (length > left - RECORD_HEADER) return undefined;
    const next = at + RECORD_HEADER + length;
    switch (opcode) {
      case OPCODE.chunk:
        return this.#chunk(at, length, sink) ? next : undefined;
      case OPCODE.header:
        return this.#headerFits(at, length) ? next : undefined;
      case OPCODE.messageIndex:
        return this.#indexFits(at, length) ? next : undefined;
      case OPCODE.dataEnd:
        return length === 4 ? 'end' : undefined;
      default:
        return undefined;
    }
  }

  // No CRC covers these two: a wrong length, which would hide the chunks after it, is known by the
  // lengths inside.

  #headerFits(at: number, length: number): boolean {
    if (length < 8 || length > HEADER_MOST) return false;
    const whole = this.#bytes(at, RECORD_HEADER + length);
    const profile = whole.readUInt32LE(RECORD_HEADER);
    if (profile > length - 8) return false;
    return whole.readUInt32LE(RECORD_HEADER + 4 + profile) === length - 8 - profile;
  }

  #indexFits(at: number, length: number): boolean {
    return length >= 6 && this.#bytes(at, RECORD_HEADER + 6).readUInt32LE(11) === length - 6;
  }

  #chunk(at: number, length: number, sink: ChunkSink | undefined): boolean {
    if (length < CHUNK_HEADER || length > CHUNK_MOST) return false;
    const whole = this.#bytes(at, RECORD_HEADER + length);
    const view = new DataView(whole.buffer, whole.byteOffset, whole.length);
    const size = view.getUint32(25, true);
    const named = view.getUint32(37, true);
    if (view.getUint32(29, true) !== 0 || named > 8) return false;
    const recordsAt = RECORD_HEADER + CHUNK_HEADER + named;
    if (recordsAt > whole.length) return false;
    const stored = view.getUint32(recordsAt - 8, true);
    if (view.getUint32(recordsAt - 4, true) !== 0 || recordsAt + stored !== whole.length)
      return false;
    const compression = whole.toString('latin1', 41, 41 + named);
    let records: Uint8Array = whole.subarray(recordsAt);
    if (compression === 'zstd') {
      if (size > CHUNK_MOST) return false;
      try {
        records = this.#decompress(records, size);
      } catch {
        return false;
      }
    } else if (compression !== '') return false;
    if (records.length !== size || crc32(records) !== view.getUint32(33, true)) return false;
    sink?.chunk(records, new DataView(records.buffer, records.byteOffset, records.byteLength));
    return true;
  }

  /** The next place from `from` on where a whole chunk with a right CRC stands, or data ends. */
  #nextChunk(from: number): number | undefined {
    for (let at = from; at + RECORD_HEADER <= this.#size; ) {
      const length = Math.min(WINDOW >> 1, this.#size - at);
      let window = this.#bytes(at, length);
      // Of the records, a chunk is never as short as a data end (4 bytes).
      for (let i = 0; i + RECORD_HEADER <= length; i++) {
        const opcode = window[i];
        if (opcode !== OPCODE.chunk && opcode !== OPCODE.dataEnd) continue;
        if (this.#standsAt(at + i, opcode)) return at + i;
        // Checking may have moved what `window` shows.
        window = this.#bytes(at, length);
      }
      if (at + length >= this.#size) return undefined;
      at += length - RECORD_HEADER + 1;
    }
    return undefined;
  }

  #standsAt(at: number, opcode: number): boolean {
    const head = this.#bytes(at, RECORD_HEADER);
    const length = head.readUInt32LE(1);
    if (head.readUInt32LE(5) !== 0 || length > this.#size - at - RECORD_HEADER) return false;
    if (opcode === OPCODE.chunk) return this.#chunk(at, length, undefined);
    return length === 4 && this.#closesAt(at + RECORD_HEADER + 4);
  }

  /** A data end is followed by the summary or the footer, and the file ends in magic. */
  #closesAt(at: number): boolean {
    if (this.#size - at < 29 + MAGIC.length) return false;
    const tail = this.#bytes(this.#size - MAGIC.length, MAGIC.length);
    return MAGIC.every((byte, i) => tail[i] === byte);
  }

  #end(at: number, sink: ChunkSink): Ending {
    const after = at + RECORD_HEADER + 4;
    if (this.#closesAt(after)) return { kind: 'closed' };
    // A file cut within its summary has lost nothing but the index.
    if (this.#size - after < 29 + MAGIC.length) return { kind: 'open' };
    sink.damaged(this.#size - after, null, null);
    return { kind: 'closed' };
  }

  /** Nothing whole follows: the file was cut, or its last chunk is damaged. */
  #lost(at: number, sink: ChunkSink): Ending {
    const left = this.#size - at;
    const head = this.#bytes(at, Math.min(left, RECORD_HEADER));
    // Cut within the closing bytes, which hold nothing.
    if (head[0] === OPCODE.dataEnd && left < CLOSING_BYTES) return { kind: 'open' };
    if (head[0] === OPCODE.chunk && left >= RECORD_HEADER) {
      const length = head.readUInt32LE(1) + head.readUInt32LE(5) * 0x1_0000_0000;
      if (length <= left - RECORD_HEADER) {
        this.#report(at, left, sink);
        return { kind: 'open' };
      }
    }
    return { kind: 'torn', bytesLost: left };
  }

  #report(at: number, bytes: number, sink: ChunkSink): void {
    const head = bytes >= RECORD_HEADER + CHUNK_HEADER ? this.#bytes(at, 25) : undefined;
    if (head?.[0] === OPCODE.chunk) {
      const view = new DataView(head.buffer, head.byteOffset, head.length);
      sink.damaged(bytes, readMicroseconds(view, 9), readMicroseconds(view, 17));
    } else sink.damaged(bytes, null, null);
  }

  /** `length` bytes of the file at `at`: a view that the next call may overwrite. */
  #bytes(at: number, length: number): Buffer {
    if (at < this.#windowAt || at + length > this.#windowEnd) {
      if (length > this.#window.length) this.#window = Buffer.allocUnsafe(length * 2);
      let filled = 0;
      const wanted = Math.min(this.#window.length, this.#size - at);
      while (filled < wanted) {
        const n = fs.readSync(this.#fd, this.#window, filled, wanted - filled, at + filled);
        if (n === 0)
          throw new LapwingError('recordUnreadable', 'the file became shorter while it was read');
        filled += n;
      }
      this.#windowAt = at;
      this.#windowEnd = at + filled;
    }
    const from = at - this.#windowAt;
    return this.#window.subarray(from, from + length);
  }
}
