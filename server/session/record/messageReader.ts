import { LapwingError } from '../../errors/codes.js';
import type { HostMessageName, MessageOf } from '../../wire/messages.js';
import type { StampedDecision } from '../decisions.js';
import type { RareInput } from '../inputs.js';
import { CHANNELS, RECORD_FORMAT } from './channels.js';
import { readMicroseconds } from './chunkBuffer.js';
import type { ChunkSink } from './chunkScanner.js';
import type { RecordVisitor } from './readRecord.js';
import { type ClockPoint, RecordClock } from './recordClock.js';
import type { RecordHeader } from './recorder.js';
import type { Trouble } from './recordState.js';
import { SampleReader, type SampleVisitor } from './sampleReader.js';

/** Told each message as it is stored: for copying a record. The bytes are reused after the call. */
export type MessageSink = (
  topic: string,
  sequence: number,
  timeUs: number,
  data: Uint8Array,
) => void;

const OPCODE = { schema: 0x03, channel: 0x04, message: 0x05 };
const RECORD_HEADER = 9;
const MESSAGE_HEADER = 22;

type What = 'segment' | 'samples' | 'input' | 'command' | 'decision' | 'unknown';
function whatIs(topic: string): What {
  if (topic === '/segment') return 'segment';
  if (topic === '/inputs/samples') return 'samples';
  if (topic.startsWith('/inputs/')) return 'input';
  if (topic === '/commands') return 'command';
  return topic.startsWith('/decisions/') ? 'decision' : 'unknown';
}

/**
 * Turns the chunks of a record's files into calls of a visitor, and keeps account of which messages
 * came: their numbers run on through all files, so that one told twice (written again to a new file
 * after a failed sync) is dropped, and one that is missing is noticed.
 */
export class MessageReader implements ChunkSink {
  /** Messages numbered up to now, those that are missing included. */
  count = 0;
  lastInput = -1;
  /** Log time of the message being told, microseconds since 1970. */
  timeUs = 0;
  header: RecordHeader | undefined;
  /** The file being read says in its last message that it is complete. */
  closed = false;
  /** Of a finished file: how many segments it holds; else 0. */
  joined = 0;
  /** What a finished file says was missing from those it was made from. */
  readonly carried: Trouble[] = [];
  readonly #visitor: RecordVisitor;
  readonly #raw: MessageSink | undefined;
  readonly #troubles: Trouble[];
  readonly #samples = new SampleReader();
  readonly #sampleVisitor: SampleVisitor = {};
  /** Where the writer asked its host how long a silence was, the answer is in the log time. */
  readonly #clock = new RecordClock(undefined, () =>
    this.header === undefined ? 0 : this.timeUs - this.header.startedAtMs * 1000,
  );
  readonly #text = new TextDecoder();
  /** By the ids of this file. */
  #what: What[] = [];
  #topics: string[] = [];
  #file = '';
  /** A trouble just noticed whose far side is not yet known. */
  #damage: { bytes: number; fromUs: number | null; toUs: number | null } | undefined;

  constructor(visitor: RecordVisitor, raw: MessageSink | undefined, troubles: Trouble[]) {
    this.#visitor = visitor;
    this.#raw = raw;
    this.#troubles = troubles;
    if (visitor.sample !== undefined)
      this.#sampleVisitor.sample = (input, sample) => visitor.sample!(input, sample);
    if (visitor.command !== undefined)
      this.#sampleVisitor.beat = (input, beat) => visitor.command!(input, 'beat', beat);
  }

  clockPoint(): ClockPoint | undefined {
    return this.#clock.point();
  }

  beginFile(file: string): void {
    this.#noteDamage(null);
    this.#file = file;
    this.closed = false;
    // Until the file's own channels are read: should they be damaged, it has those of this version.
    this.#what = [];
    this.#topics = [];
    for (const { id, topic } of CHANNELS) this.#name(id, topic);
  }

  end(): void {
    this.#noteDamage(null);
  }

  damaged(bytes: number, fromUs: number | null, toUs: number | null): void {
    if (this.#damage !== undefined) this.#noteDamage(null);
    this.#damage = { bytes, fromUs, toUs };
  }

  chunk(records: Uint8Array, view: DataView): void {
    for (let at = 0; at < records.length; ) {
      const opcode = records[at]!;
      const next = at + RECORD_HEADER + view.getUint32(at + 1, true);
      if (opcode === OPCODE.message) this.#message(records, view, at + RECORD_HEADER, next);
      else if (opcode === OPCODE.channel) this.#channel(records, view, at + RECORD_HEADER);
      at = next;
    }
  }

  #channel(records: Uint8Array, view: DataView, at: number): void {
    const length = view.getUint32(at + 4, true);
    const topic = this.#text.decode(records.subarray(at + 8, at + 8 + length));
    this.#name(view.getUint16(at, true), topic);
  }

  #name(id: number, topic: string): void {
    this.#what[id] = whatIs(topic);
    this.#topics[id] = topic;
  }

  #message(records: Uint8Array, view: DataView, at: number, end: number): void {
    const channel = view.getUint16(at, true);
    const number = view.getUint32(at + 2, true);
    const timeUs = readMicroseconds(view, at + 6);
    const from = at + MESSAGE_HEADER;
    const what = this.#what[channel] ?? 'unknown';
    if (what === 'segment') {
      if (this.#damage !== undefined) this.#noteDamage(timeUs);
      this.#segment(records.subarray(from, end), timeUs);
      this.#raw?.(this.#topics[channel] ?? '', number, timeUs, records.subarray(from, end));
      return;
    }
    // Numbers are stored modulo 2^32; the nearest is meant.
    const ahead = (number - this.count) | 0;
    if (ahead < 0) return;
    if (ahead > 0 || this.#damage !== undefined) {
      const next = this.#inputOf(what, records, from, end);
      if (this.#damage !== undefined) this.#noteDamage(timeUs);
      if (ahead > 0) this.#noteMissing(ahead, next, timeUs);
    }
    this.count += ahead + 1;
    this.timeUs = timeUs;
    this.closed = false;
    this.#raw?.(this.#topics[channel] ?? '', number, timeUs, records.subarray(from, end));
    this.#tell(what, records, from, end);
  }

  #tell(what: What, records: Uint8Array, from: number, end: number): void {
    if (what === 'samples') {
      this.lastInput = this.#samples.read(records, from, end, this.#sampleVisitor);
      this.#clock.raw(this.#samples.firstBoardUs);
      this.#clock.raw(this.#samples.lastBoardUs);
      return;
    }
    const visitor = this.#visitor;
    if (what === 'input') {
      const { input, ...rest } = this.#parse(records, from, end) as { input: number };
      this.lastInput = input;
      this.#clock.input(rest as RareInput);
      visitor.input?.(input, rest as RareInput);
    } else if (what === 'command') {
      if (visitor.command === undefined) return;
      const { input, name, message } = this.#parse(records, from, end) as CommandObject;
      visitor.command(input, name, message);
    } else if (what === 'decision' && visitor.decision !== undefined)
      visitor.decision(this.#parse(records, from, end) as StampedDecision);
  }

  #parse(records: Uint8Array, from: number, end: number): unknown {
    return JSON.parse(this.#text.decode(records.subarray(from, end)));
  }

  /** The input a message is about, without telling it. */
  #inputOf(what: What, records: Uint8Array, from: number, end: number): number | null {
    if (what === 'unknown') return null;
    if (what !== 'samples') return (this.#parse(records, from, end) as { input: number }).input;
    let first: number | null = null;
    this.#samples.read(records, from, end, {
      sample(input) {
        first ??= input;
      },
    });
    return first;
  }

  #segment(data: Uint8Array, timeUs: number): void {
    const message = JSON.parse(this.#text.decode(data)) as SegmentMessage;
    if (message.format > RECORD_FORMAT)
      throw new LapwingError(
        'recordTooNew',
        `${this.#file} has format ${message.format}; this version reads up to ${RECORD_FORMAT}.`,
      );
    this.joined = Math.max(this.joined, message.joined ?? 0);
    this.timeUs = Math.max(this.timeUs, timeUs);
    if (message.event === 'open') {
      if (message.continues) this.#forgetEnd();
      this.header ??= {
        session: message.session,
        startedAtMs: Date.parse(message.startedAt),
        software: message.software,
        seed: message.seed,
      };
      return;
    }
    this.closed = true;
    if (message.losses !== undefined) this.carried.push(...message.losses);
    const lost = message.messages - this.count;
    if (lost > 0) {
      this.#noteMissing(lost, null, timeUs);
      this.count = message.messages;
    }
  }

  /**
   * The same recording went on in this file, with all that the last one may not have kept: that the
   * last one was not closed means nothing.
   */
  #forgetEnd(): void {
    const last = this.#troubles.at(-1);
    if (last?.kind === 'open' || last?.kind === 'torn') this.#troubles.pop();
  }

  /** Reports damage, now that something readable follows it (or null: nothing does). */
  #noteDamage(nextUs: number | null): void {
    const damage = this.#damage;
    if (damage === undefined) return;
    this.#damage = undefined;
    // The chunk's own header may be what is damaged: the messages around it are surer.
    const before = this.timeUs === 0 ? null : this.timeUs;
    this.#troubles.push({
      kind: 'damaged',
      file: this.#file,
      fromUs: before ?? damage.fromUs,
      toUs: nextUs ?? damage.toUs,
      bytes: damage.bytes,
    });
  }

  #noteMissing(messages: number, nextInput: number | null, toUs: number): void {
    this.#troubles.push({
      kind: 'missing',
      file: this.#file,
      messages,
      lastInput: this.lastInput,
      nextInput,
      fromUs: this.timeUs === 0 ? null : this.timeUs,
      toUs,
    });
  }
}

interface CommandObject {
  readonly input: number;
  readonly name: HostMessageName;
  readonly message: MessageOf[HostMessageName];
}
interface SegmentMessage {
  readonly event: 'open' | 'close';
  readonly format: number;
  readonly segment: number;
  readonly messages: number;
  readonly session: string;
  readonly startedAt: string;
  readonly software: string;
  readonly seed: string;
  /** The same recording as in the file before. */
  readonly continues: boolean;
  /** Of a finished file: how many files it was made from, and what was missing from them. */
  readonly joined?: number;
  readonly losses?: readonly Trouble[];
}
