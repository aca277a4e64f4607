import { createHash, type Hash } from 'node:crypto';
import fs from 'node:fs';
import path from 'node:path';
import zstd from '@foxglove/wasm-zstd';
import { McapStreamReader } from '@mcap/core';
import { LapwingError } from '../../errors/codes.js';
import { syncFolder } from '../writeFileWhole.js';
import { CHANNELS, RECORD_FORMAT, SEGMENT_CHANNEL } from './channels.js';
import { IndexedWriter } from './indexedWriter.js';
import { LIBRARY } from './prelude.js';
import { type RecordReader, readRecord } from './readRecord.js';
import { segmentsIn } from './recorder.js';
import { refuseWhileRecording, unlockRecord } from './recordLock.js';
import type { RecordState } from './recordState.js';
import { segmentName } from './segmentLog.js';

export interface Finished {
  readonly state: RecordState;
  /** Size of `record.mcap` now. */
  readonly bytes: number;
  /** Files put aside because not all of them could be read: `original-1.mcap`, ... */
  readonly originals: readonly string[];
}

/** The file while it is being made; one left over from an interruption is made again. */
const TEMPORARY = 'finishing.mcap';
const ID_OF = new Map(CHANNELS.map(({ topic, id }) => [topic, id]));

/**
 * Makes one compressed, indexed `record.mcap` of a record's files, compares it with them message by
 * message, and only then puts it in their place. Interrupted anywhere, it leaves a record that can
 * be read and finished again. A file that was not whole is kept beside it, as `original-N.mcap`.
 *
 * `progress` is called with the share done, 0 to 1. Throws `RECORD_BUSY` while it is being recorded, `RECORD_UNFINISHED` where the result could not be
 * written or is not the same.
 */
export async function finishRecord(
  folder: string,
  progress: (done: number) => void = () => {},
): Promise<Finished> {
  refuseWhileRecording(folder);
  const temporary = path.join(folder, TEMPORARY);
  fs.rmSync(temporary, { force: true });
  const reader = await readRecord(folder);
  const before = reader.visit({});
  if (before.finished && before.found === 0) return settle(folder, before);
  try {
    const copied = await copy(reader, before, temporary, (done) => progress(0.8 * done));
    const read = await digestOf(temporary, (done) => progress(0.8 + 0.2 * done));
    if (read !== copied) throw new Error('the finished file is not the same as the live record');
    return settle(folder, before, temporary);
  } catch (error) {
    fs.rmSync(temporary, { force: true });
    if (error instanceof LapwingError) throw error;
    throw new LapwingError('recordUnfinished', `${folder}: ${(error as Error).message}`, {
      cause: error,
    });
  }
}

/** Copies every message into the new file, and returns a digest of all of them in order. */
async function copy(
  reader: RecordReader,
  state: RecordState,
  file: string,
  progress: (done: number) => void,
): Promise<string> {
  const digest = createHash('sha256');
  const writer = new IndexedWriter(file);
  let lastTime = 0n;
  let copied = 0;
  const put = (channelId: number, sequence: number, logTime: bigint, data: Uint8Array) => {
    digestMessage(digest, channelId, sequence, logTime, data);
    writer.add({ channelId, sequence, logTime, publishTime: logTime, data });
    lastTime = logTime;
    if ((++copied & 0x3ff) === 0) progress(Math.min(1, copied / state.messages));
  };
  try {
    reader.visitMessages((topic, sequence, timeUs, data) => {
      const channelId = ID_OF.get(topic);
      if (channelId === undefined) throw new Error(`the topic ${topic} is not known here`);
      put(channelId, sequence, BigInt(timeUs) * 1000n, data);
    }, {});
    put(SEGMENT_CHANNEL, state.messages >>> 0, lastTime, closingMessage(reader, state));
    writer.finish();
  } catch (error) {
    writer.abandon();
    throw error;
  }
  return digest.digest('hex');
}

/** The last message: the file is complete, of how many it was made, and what they lacked. */
function closingMessage(reader: RecordReader, state: RecordState): Uint8Array {
  const { segment, messages, lastInput } = reader.resumePoint();
  const message = {
    input: lastInput,
    event: 'close',
    format: RECORD_FORMAT,
    segment,
    messages,
    continues: true,
    session: reader.header?.session ?? '',
    startedAt: new Date(reader.header?.startedAtMs ?? 0).toISOString(),
    software: LIBRARY,
    seed: reader.header?.seed ?? '',
    reason: 'finished',
    joined: segment,
    losses: state.troubles,
  };
  return new TextEncoder().encode(JSON.stringify(message));
}

/** Reads the file with the public reader, all CRCs checked, and digests its messages in order. */
async function digestOf(file: string, progress: (done: number) => void): Promise<string> {
  const digest = createHash('sha256');
  const reader = new McapStreamReader({
    validateCrcs: true,
    decompressHandlers: { zstd: (bytes, size) => zstd.decompress(bytes, Number(size)) },
  });
  const { size } = fs.statSync(file);
  let bytes = 0;
  for await (const piece of fs.createReadStream(file, { highWaterMark: 1 << 20 })) {
    reader.append(piece as Uint8Array);
    bytes += (piece as Uint8Array).length;
    progress(bytes / size);
    for (let record = reader.nextRecord(); record !== undefined; record = reader.nextRecord())
      if (record.type === 'Message')
        digestMessage(digest, record.channelId, record.sequence, record.logTime, record.data);
  }
  if (!reader.done()) throw new Error('the finished file is cut short');
  return digest.digest('hex');
}

const head = new DataView(new ArrayBuffer(20));
function digestMessage(
  digest: Hash,
  channelId: number,
  sequence: number,
  logTime: bigint,
  data: Uint8Array,
): void {
  head.setUint32(0, channelId);
  head.setUint32(4, sequence);
  head.setBigUint64(8, logTime);
  head.setUint32(16, data.length);
  digest.update(head).update(data);
}

/** Puts the finished file in place, and keeps or removes those it was made from. */
function settle(folder: string, state: RecordState, temporary?: string): Finished {
  const record = path.join(folder, segmentName(1));
  const segments = segmentsIn(folder);
  const bad = new Set(state.troubles.filter(({ kind }) => kind !== 'open').map(({ file }) => file));
  const originals: string[] = [];
  if (temporary !== undefined) {
    if (segments[0] === 1 && bad.has(segmentName(1))) originals.push(keep(folder, 1));
    fs.renameSync(temporary, record);
    syncFolder(folder);
  }
  for (const segment of segments) {
    if (segment === 1) continue;
    const name = segmentName(segment);
    if (bad.has(name)) originals.push(keep(folder, segment));
    fs.rmSync(path.join(folder, name));
  }
  // Of a process that died: a living one was refused above.
  unlockRecord(folder);
  syncFolder(folder);
  return { state: { ...state, finished: true }, bytes: fs.statSync(record).size, originals };
}

/** Gives the file a second name, under which it stays when the first is taken away. */
function keep(folder: string, segment: number): string {
  const file = path.join(folder, segmentName(segment));
  for (let n = segment; ; n++) {
    const name = `original-${n}.mcap`;
    const kept = path.join(folder, name);
    if (fs.existsSync(kept)) {
      // Kept already, by an attempt that was interrupted.
      if (fs.statSync(kept).ino === fs.statSync(file).ino) return name;
      continue;
    }
    try {
      fs.linkSync(file, kept);
    } catch {
      // A file system without links: a copy, then.
      fs.copyFileSync(file, kept, fs.constants.COPYFILE_EXCL);
    }
    return name;
  }
}
