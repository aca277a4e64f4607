import path from 'node:path';
import zstd from '@foxglove/wasm-zstd';
import { LapwingError } from '../../errors/codes.js';
import type { HostMessageName, MessageOf, Sample } from '../../wire/messages.js';
import type { StampedDecision } from '../decisions.js';
import type { RareInput } from '../inputs.js';
import { ChunkScanner, type Ending } from './chunkScanner.js';
import { MessageReader, type MessageSink } from './messageReader.js';
import type { RecordHeader, ResumePoint } from './recorder.js';
import { segmentsIn } from './recorder.js';
import { type RecordState, type Trouble, worstOf } from './recordState.js';
import { segmentName } from './segmentLog.js';

/** What a reading calls, in the order of recording. What is left out is not decoded. */
export interface RecordVisitor {
  /** `sample` is reused: take what is needed before returning. */
  sample?(input: number, sample: Sample): void;
  input?(input: number, what: RareInput): void;
  /** What the host sent because of input `input`; the message of a `beat` is reused. */
  command?<N extends HostMessageName>(input: number, name: N, message: MessageOf[N]): void;
  decision?(decision: StampedDecision): void;
}

/**
 * Opens the record in a session folder, finished or live, of one file or several, whole or not.
 * Throws `RECORD_MISSING`, `RECORD_TOO_NEW` or `RECORD_UNREADABLE`.
 */
export async function readRecord(folder: string): Promise<RecordReader> {
  await zstd.isLoaded;
  return new RecordReader(folder);
}

export class RecordReader {
  readonly #folder: string;
  readonly #segments: readonly number[];
  #header: RecordHeader | undefined;
  #resume: ResumePoint | undefined;
  #timeUs = 0;
  #messages: MessageReader | undefined;

  constructor(folder: string) {
    this.#folder = folder;
    let segments: number[];
    try {
      segments = segmentsIn(folder);
    } catch (error) {
      throw new LapwingError('recordMissing', `${folder} cannot be opened.`, { cause: error });
    }
    if (segments.length === 0)
      throw new LapwingError('recordMissing', `${folder} holds no record.mcap.`);
    this.#segments = segments;
  }

  /** The record's files, in order. */
  get files(): string[] {
    return this.#segments.map((segment) => path.join(this.#folder, segmentName(segment)));
  }

  /** During a visit: the log time of the message being told, microseconds since 1970. */
  get timeUs(): number {
    return this.#messages?.timeUs ?? this.#timeUs;
  }

  /** What the record says of its session; undefined where that part is damaged. After a visit. */
  get header(): RecordHeader | undefined {
    return this.#header;
  }

  /** How a recording would go on from where this record stops. After a visit. */
  resumePoint(): ResumePoint {
    if (this.#resume === undefined) this.visit({});
    return this.#resume!;
  }

  /** Reads the record from its beginning and tells all of it; the state says what is missing. */
  visit(visitor: RecordVisitor): RecordState {
    return this.visitMessages(undefined, visitor);
  }

  /** As `visit`; `raw` is told the encoded messages as well. */
  visitMessages(raw: MessageSink | undefined, visitor: RecordVisitor): RecordState {
    const troubles: Trouble[] = [];
    const messages = new MessageReader(visitor, raw, troubles);
    this.#messages = messages;
    try {
      for (const segment of this.#segments) {
        // A finished file holds all segments; those still there were about to be removed.
        if (segment > 1 && segment <= messages.joined) continue;
        this.#readFile(segmentName(segment), messages, troubles);
      }
    } finally {
      this.#messages = undefined;
    }
    messages.end();
    this.#timeUs = messages.timeUs;
    this.#header = messages.header;
    this.#resume = {
      segment: Math.max(this.#segments.at(-1)!, messages.joined),
      messages: messages.count,
      lastInput: messages.lastInput,
      clock: messages.clockPoint(),
    };
    const all = [...messages.carried, ...troubles];
    return {
      state: worstOf(all),
      finished: messages.joined > 0,
      messages: messages.count,
      lastInput: messages.lastInput,
      troubles: all,
      found: troubles.length,
    };
  }

  #readFile(file: string, messages: MessageReader, troubles: Trouble[]): void {
    messages.beginFile(file);
    let ending: Ending;
    let scanner: ChunkScanner | undefined;
    try {
      scanner = new ChunkScanner(path.join(this.#folder, file), zstd.decompress);
      ending = scanner.scan(messages);
    } catch (error) {
      if (error instanceof LapwingError || !(error instanceof Error) || !('syscall' in error))
        throw error;
      throw new LapwingError('recordUnreadable', `${file}: ${error.message}`, { cause: error });
    } finally {
      scanner?.close();
    }
    const { lastInput, closed } = messages;
    if (ending.kind === 'torn' && !closed)
      troubles.push({ kind: 'torn', file, lastInput, bytesLost: ending.bytesLost });
    else if (ending.kind !== 'closed' || !closed)
      troubles.push({ kind: 'open', file, lastInput, complete: closed });
  }
}
