import fs from 'node:fs';
import { crc32 } from 'node:zlib';
import zstd from '@foxglove/wasm-zstd';
import { McapChunkBuilder, McapRecordBuilder, type McapTypes, Opcode } from '@mcap/core';
import { CHANNELS } from './channels.js';
import { LIBRARY, PROFILE } from './prelude.js';

/** Uncompressed size of a chunk: what a reader that seeks must decompress to see one message. */
const CHUNK_BYTES = 1 << 20;
const ZSTD_LEVEL = 3;

/**
 * Writes a compressed MCAP file with message indexes and a summary, through and through
 * synchronous; `zstd.isLoaded` must have been awaited.
 */
export class IndexedWriter {
  readonly #fd: number;
  readonly #records = new McapRecordBuilder();
  readonly #chunk = new McapChunkBuilder({ useMessageIndex: true });
  readonly #chunks: McapTypes.ChunkIndex[] = [];
  readonly #counts = new Map<number, bigint>();
  #position = 0;
  #crc = 0;
  #messages = 0n;
  #firstTime = 0n;
  #lastTime = 0n;

  /** Creates the file; throws where it is there already. */
  constructor(file: string) {
    this.#fd = fs.openSync(file, 'wx', 0o644);
    this.#records.writeMagic();
    this.#records.writeHeader({ profile: PROFILE, library: LIBRARY });
    this.#put();
    // With the first chunk, so that its CRC covers them.
    for (const channel of CHANNELS) {
      this.#chunk.addSchema(schemaOf(channel));
      this.#chunk.addChannel(channelOf(channel));
    }
  }

  add(message: McapTypes.Message): void {
    if (this.#messages === 0n) this.#firstTime = this.#lastTime = message.logTime;
    if (message.logTime < this.#firstTime) this.#firstTime = message.logTime;
    if (message.logTime > this.#lastTime) this.#lastTime = message.logTime;
    this.#messages++;
    const { channelId } = message;
    this.#counts.set(channelId, (this.#counts.get(channelId) ?? 0n) + 1n);
    this.#chunk.addMessage(message);
    if (this.#chunk.byteLength >= CHUNK_BYTES) this.#endChunk();
  }

  /** Completes the file, sends it to the disk and closes it; returns its size. */
  finish(): number {
    this.#endChunk();
    this.#records.writeDataEnd({ dataSectionCrc: this.#crc >>> 0 });
    this.#put();
    this.#writeSummary();
    fs.fsyncSync(this.#fd);
    fs.closeSync(this.#fd);
    return this.#position;
  }

  /** Closes the file as it is, to be removed. */
  abandon(): void {
    fs.closeSync(this.#fd);
  }

  #endChunk(): void {
    const chunk = this.#chunk;
    if (chunk.numMessages === 0) return;
    const raw = chunk.buffer;
    const records = zstd.compress(raw, ZSTD_LEVEL);
    const chunkStartOffset = BigInt(this.#position);
    const { messageStartTime, messageEndTime } = chunk;
    const sizes = { uncompressedSize: BigInt(raw.length), compression: 'zstd' };
    const chunkLength = this.#records.writeChunk({
      messageStartTime,
      messageEndTime,
      uncompressedCrc: crc32(raw),
      records,
      ...sizes,
    });
    const indexStart = chunkStartOffset + BigInt(this.#records.length);
    const messageIndexOffsets = new Map<number, bigint>();
    let messageIndexLength = 0n;
    for (const index of chunk.indices) {
      if (index.records.length === 0) continue;
      messageIndexOffsets.set(index.channelId, indexStart + messageIndexLength);
      messageIndexLength += this.#records.writeMessageIndex(index);
    }
    this.#put();
    this.#chunks.push({
      messageStartTime,
      messageEndTime,
      chunkStartOffset,
      chunkLength,
      messageIndexOffsets,
      messageIndexLength,
      compressedSize: BigInt(records.byteLength),
      ...sizes,
    });
    chunk.reset();
  }

  #writeSummary(): void {
    const records = this.#records;
    const start = BigInt(this.#position);
    const groups: McapTypes.SummaryOffset[] = [];
    const group = (groupOpcode: Opcode, write: () => void) => {
      const from = records.length;
      write();
      const groupLength = BigInt(records.length - from);
      groups.push({ groupOpcode, groupStart: start + BigInt(from), groupLength });
    };
    group(Opcode.SCHEMA, () => {
      for (const channel of CHANNELS) records.writeSchema(schemaOf(channel));
    });
    group(Opcode.CHANNEL, () => {
      for (const channel of CHANNELS) records.writeChannel(channelOf(channel));
    });
    group(Opcode.STATISTICS, () => records.writeStatistics(this.#statistics()));
    group(Opcode.CHUNK_INDEX, () => {
      for (const index of this.#chunks) records.writeChunkIndex(index);
    });
    const summaryOffsetStart = start + BigInt(records.length);
    for (const offset of groups) records.writeSummaryOffset(offset);
    // The summary's CRC goes up to and into the footer, but for the CRC itself.
    const footer = new DataView(new ArrayBuffer(25));
    footer.setUint8(0, Opcode.FOOTER);
    footer.setBigUint64(1, 20n, true);
    footer.setBigUint64(9, start, true);
    footer.setBigUint64(17, summaryOffsetStart, true);
    const summaryCrc = crc32(new Uint8Array(footer.buffer), crc32(records.buffer));
    records.writeFooter({ summaryStart: start, summaryOffsetStart, summaryCrc });
    records.writeMagic();
    this.#put();
  }

  #statistics(): McapTypes.Statistics {
    return {
      messageCount: this.#messages,
      schemaCount: CHANNELS.length,
      channelCount: CHANNELS.length,
      attachmentCount: 0,
      metadataCount: 0,
      chunkCount: this.#chunks.length,
      messageStartTime: this.#firstTime,
      messageEndTime: this.#lastTime,
      channelMessageCounts: this.#counts,
    };
  }

  /** Writes out what the record builder holds. */
  #put(): void {
    const bytes = this.#records.buffer;
    for (let at = 0; at < bytes.length; )
      at += fs.writeSync(this.#fd, bytes, at, bytes.length - at);
    this.#crc = crc32(bytes, this.#crc);
    this.#position += bytes.length;
    this.#records.reset();
  }
}

type Spec = (typeof CHANNELS)[number];
function schemaOf({ id, schemaName, schemaEncoding, schema }: Spec): McapTypes.Schema {
  return { id, name: schemaName, encoding: schemaEncoding, data: schema() };
}
function channelOf({ id, topic, messageEncoding, metadata }: Spec): McapTypes.Channel {
  return { id, schemaId: id, topic, messageEncoding, metadata: new Map(metadata) };
}
