import fs from 'node:fs';
import path from 'node:path';
import { LapwingError } from '../../errors/codes.js';
import type { Beat, HostMessageName, MessageOf, Sample } from '../../wire/messages.js';
import type { StampedDecision } from '../decisions.js';
import type { RareInput } from '../inputs.js';
import {
  COMMAND_CHANNEL,
  DECISION_CHANNEL,
  INPUT_CHANNEL,
  RECORD_FORMAT,
  SAMPLES_CHANNEL,
  SEGMENT_CHANNEL,
} from './channels.js';
import { ChunkBuffer } from './chunkBuffer.js';
import { onTheWire } from './onTheWire.js';
import { closingBytes, openingBytes, schemaRecords } from './prelude.js';
import { type ClockPoint, RecordClock } from './recordClock.js';
import { diskFiles, type RecordFiles } from './recordFile.js';
import { lockRecord, unlockRecord } from './recordLock.js';
import { SampleBlock } from './sampleBlock.js';
import { type OnTrouble, SegmentLog } from './segmentLog.js';

/** What every file of the record says of its session. */
export interface RecordHeader {
  /** The session folder's name. */
  readonly session: string;
  /** Session start, milliseconds since 1970: log times count from it. */
  readonly startedAtMs: number;
  readonly software: string;
  readonly seed: string;
}

/** Where a record stops, from `RecordReader.resumePoint`: a later recording goes on from it. */
export interface ResumePoint {
  readonly segment: number;
  /** Messages numbered so far, and the newest input among them (-1: none). */
  readonly messages: number;
  readonly lastInput: number;
  readonly clock: ClockPoint | undefined;
}

export interface RecorderOptions {
  /** `bulk` is for rehearsal: large chunks, no sync, nothing by the clock. */
  readonly mode?: 'live' | 'bulk';
  /** Must not throw; may be called from within any method here, and from a sync's end. */
  readonly onTrouble?: OnTrouble;
  readonly resume?: ResumePoint;
  readonly files?: RecordFiles;
  /** The host's monotonic clock, milliseconds. */
  readonly nowMs?: () => number;
}

/** The oldest thing not yet written is at most this old after a batch. */
const LIVE_MS = 20;
const CHUNK_MOST = 1 << 20;

/**
 * Writes a record as it happens: every engine input in order, and in between what the host sent and
 * decided. Nothing here throws once the recorder is made: a disk's trouble goes to `onTrouble`.
 */
export class Recorder {
  readonly #folder: string;
  readonly #live: boolean;
  readonly #nowMs: () => number;
  readonly #startUs: number;
  readonly #header: RecordHeader;
  readonly #firstSegment: number;
  readonly #clock: RecordClock;
  readonly #log: SegmentLog;
  readonly #block = new SampleBlock();
  readonly #chunk = new ChunkBuffer();
  readonly #encoder = new TextEncoder();
  #text = new Uint8Array(1 << 12);
  #messages: number;
  #lastInput: number;
  /** When the oldest unwritten thing was there; 0: nothing is known to wait. */
  #waitingSince = 0;

  private constructor(folder: string, header: RecordHeader, options: RecorderOptions) {
    this.#folder = folder;
    this.#header = header;
    this.#live = options.mode !== 'bulk';
    this.#nowMs = options.nowMs ?? (() => performance.now());
    this.#startUs = Math.floor(header.startedAtMs) * 1000;
    const { resume } = options;
    this.#firstSegment = (resume?.segment ?? 0) + 1;
    this.#messages = resume?.messages ?? 0;
    this.#lastInput = resume?.lastInput ?? -1;
    const hostUs = () => Date.now() * 1000 - this.#startUs;
    this.#clock = new RecordClock(resume?.clock, this.#live ? hostUs : undefined);
    this.#log = new SegmentLog(
      {
        folder,
        segment: this.#firstSegment,
        files: options.files ?? diskFiles,
        sync: this.#live,
        opening: (segment, reason) => this.#opening(segment, reason),
        onTrouble: options.onTrouble ?? (() => {}),
      },
      this.#nowMs(),
    );
  }

  /**
   * Begins a record in the folder, or the next file of one that `options.resume` says how to go on
   * with. Throws `RECORD_EXISTS` where a record is that was not asked to be resumed, `RECORD_BUSY`
   * where another process is recording, `RECORD_UNWRITABLE` where the first bytes cannot be written.
   */
  static create(folder: string, header: RecordHeader, options: RecorderOptions = {}): Recorder {
    const there = segmentsIn(folder).at(-1) ?? 0;
    if (there > (options.resume?.segment ?? 0))
      throw new LapwingError('recordExists', `${folder} holds a record already.`);
    lockRecord(folder);
    try {
      return new Recorder(folder, header, options);
    } catch (error) {
      unlockRecord(folder);
      throw new LapwingError(
        'recordUnwritable',
        `${folder} cannot be recorded into: ${(error as Error).message}`,
        { cause: error },
      );
    }
  }

  /** Bytes written so far, in all files. */
  get bytes(): number {
    return this.#log.bytes;
  }
  get state(): 'writing' | 'failed' | 'closed' {
    return this.#log.state;
  }
  /** Why the state is `failed`; else empty. */
  get reason(): string {
    return this.#log.reason;
  }
  /** How far the disk is behind with what it was given, milliseconds; about 0 on a healthy one. */
  get behindMs(): number {
    return this.#log.syncingMs(this.#nowMs());
  }
  /** Sequence number of the newest input recorded; -1 before any. */
  get lastInput(): number {
    return this.#lastInput;
  }
  /** The record's time of the newest message: microseconds since 1970. */
  get timeUs(): number {
    return this.#startUs + this.#clock.sessionUs;
  }

  /** Records a sample as input number `input`; `m` may be reused by the caller. */
  sample(input: number, m: Sample): void {
    if (!this.#block.add(input, m)) {
      this.#closeBlock();
      this.#block.add(input, m);
    }
    this.#lastInput = input;
  }

  /** Records any other input as input number `input`. */
  input(input: number, what: RareInput): void {
    this.#closeBlock();
    this.#clock.input(what);
    this.#lastInput = input;
    // Put in front by hand: a copy of the object with one more key costs more, and its key order
    // would be another.
    this.#json(INPUT_CHANNEL[what.kind], `{"input":${input},` + JSON.stringify(what).slice(1));
  }

  /** Records a message sent to the board because of input `input`. */
  command<N extends HostMessageName>(input: number, name: N, message: MessageOf[N]): void {
    if (name === 'beat' && this.#block.addBeat(input, message as Beat)) return;
    this.#closeBlock();
    const body = JSON.stringify(onTheWire(name, message));
    this.#json(COMMAND_CHANNEL, `{"input":${input},"name":"${name}","message":${body}}`);
  }

  decision(decision: StampedDecision): void {
    this.#closeBlock();
    this.#json(DECISION_CHANNEL[decision.kind], JSON.stringify(decision));
  }

  /**
   * After each batch of frames. A batch that sent the board a command is written at once; otherwise
   * what waits is written when it is 20 ms old.
   */
  batchEnd(commanded: boolean): void {
    if (!this.#live) return;
    const now = this.#nowMs();
    if (this.#waitingSince === 0) this.#waitingSince = now;
    if (commanded || now - this.#waitingSince >= LIVE_MS) this.#flush(now);
  }

  /** The loop's own tick, every 20 ms: writes what waits, tries again what failed, syncs. */
  tick(): void {
    if (this.#live) this.#flush(this.#nowMs());
  }

  /**
   * Ends the record: everything is written, closed and synced before this returns. False: something
   * could not be written, and `onTrouble` was told what.
   */
  close(reason: string): boolean {
    if (this.state === 'closed') return true;
    const now = this.#nowMs();
    this.#flush(now);
    this.#addSegmentMessage(this.#chunk, 'close', this.#log.segment, reason);
    const whole = this.#log.close(this.#chunk.finish(), closingBytes(), now);
    this.#chunk.clear();
    unlockRecord(this.#folder);
    return whole;
  }

  #closeBlock(): void {
    const block = this.#block;
    if (block.samples === 0) return;
    this.#clock.raw(block.firstBoardUs);
    this.#clock.raw(block.lastBoardUs);
    this.#add(SAMPLES_CHANNEL, block.close());
  }

  #json(channel: number, text: string): void {
    // A UTF-16 unit takes three bytes of UTF-8 at most.
    if (text.length * 3 > this.#text.length) this.#text = new Uint8Array(text.length * 3);
    const { written } = this.#encoder.encodeInto(text, this.#text);
    this.#add(channel, this.#text.subarray(0, written));
  }

  #add(channel: number, data: Uint8Array): void {
    this.#chunk.add(channel, this.#messages++, this.timeUs, data);
    if (this.#chunk.length >= CHUNK_MOST) this.#writeChunk(this.#nowMs());
  }

  #flush(now: number): void {
    this.#closeBlock();
    this.#waitingSince = 0;
    if (this.#chunk.messages > 0) this.#writeChunk(now);
    else this.#log.poll(now);
  }

  #writeChunk(now: number): void {
    this.#log.append(this.#chunk.finish(), now);
    this.#chunk.clear();
  }

  #opening(segment: number, reason: string): Uint8Array {
    const chunk = new ChunkBuffer();
    chunk.addRecords(schemaRecords());
    this.#addSegmentMessage(chunk, 'open', segment, reason);
    return Buffer.concat([openingBytes(), chunk.finish()]);
  }

  /** Outside the numbering: its sequence number is that of the message which follows it. */
  #addSegmentMessage(
    chunk: ChunkBuffer,
    event: 'open' | 'close',
    segment: number,
    reason: string,
  ): void {
    const { session, startedAtMs, software, seed } = this.#header;
    const message = {
      input: this.#lastInput,
      event,
      format: RECORD_FORMAT,
      segment,
      messages: this.#messages,
      continues: segment > this.#firstSegment,
      session,
      startedAt: new Date(startedAtMs).toISOString(),
      software,
      seed,
      reason,
    };
    const data = this.#encoder.encode(JSON.stringify(message));
    chunk.add(SEGMENT_CHANNEL, this.#messages, this.timeUs, data);
  }
}

/** The numbers of the record files in the folder, in order. */
export function segmentsIn(folder: string): number[] {
  const numbers: number[] = [];
  for (const name of fs.readdirSync(path.resolve(folder))) {
    const match = /^record(?:-([1-9]\d*))?\.mcap$/.exec(name);
    if (match !== null) numbers.push(match[1] === undefined ? 1 : Number(match[1]));
  }
  return numbers.sort((a, b) => a - b);
}
