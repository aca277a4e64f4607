import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import path from 'node:path';
import zstd from '@foxglove/wasm-zstd';
import { McapIndexedReader } from '@mcap/core';
import fc from 'fast-check';
import { beforeAll, describe, expect, it } from 'vitest';
import { CHANNELS } from '../../server/session/record/channels.js';
import { finishRecord } from '../../server/session/record/finishRecord.js';
import { readRecord } from '../../server/session/record/readRecord.js';
import { Recorder } from '../../server/session/record/recorder.js';
import { describeTroubles } from '../../server/session/record/recordState.js';
import { blank } from '../../server/wire/codec.js';
import { publicRead } from './publicRead.js';
import {
  asStored,
  type Event,
  HEADER,
  readBack,
  record,
  session,
  tell,
  temporaryFolder,
} from './sessions.js';

beforeAll(() => zstd.isLoaded);

const [events] = fc
  .sample(session(2000), { seed: 31, numRuns: 30 })
  .sort((a, b) => b.length - a.length);
const stored = asStored(events!);

/** A record of two files: the first was never closed, its program killed; `cut` bytes are gone. */
async function killedAndResumed(cut: number, list = events!): Promise<string> {
  const folder = temporaryFolder();
  const middle = list.findIndex(({ type }, i) => i > list.length / 2 && type === 'sample');
  record(folder, list.slice(0, middle), { close: false });
  const file = path.join(folder, 'record.mcap');
  fs.truncateSync(file, fs.statSync(file).size - cut);
  const { pid } = spawnSync(process.execPath, ['--version']);
  fs.writeFileSync(path.join(folder, 'recording.lock'), `${pid} 1\n`);
  const resume = (await readRecord(folder)).resumePoint();
  const recorder = Recorder.create(folder, HEADER, { resume });
  for (const event of list.slice(middle)) tell(recorder, event);
  recorder.close('done');
  return folder;
}

async function indexed(file: string): Promise<McapIndexedReader> {
  const bytes = fs.readFileSync(file);
  return McapIndexedReader.Initialize({
    readable: {
      size: async () => BigInt(bytes.length),
      read: async (offset, size) => bytes.subarray(Number(offset), Number(offset + size)),
    },
    decompressHandlers: { zstd: (data, size) => zstd.decompress(data, Number(size)) },
  });
}

describe('a finished record', () => {
  it('tells exactly what the live one told, is smaller, and is the only file left', async () => {
    const folder = temporaryFolder();
    record(folder, events!);
    const live = fs.statSync(path.join(folder, 'record.mcap')).size;
    const finished = await finishRecord(folder);
    expect(finished.bytes).toBeLessThan(live);
    expect(finished.originals).toEqual([]);
    expect(fs.readdirSync(folder)).toEqual(['record.mcap']);
    const back = await readBack(folder);
    expect(back.events).toEqual(stored);
    expect(back.state).toMatchObject({ state: 'whole', finished: true, found: 0 });
  });

  it('has the indexes that a general reader seeks by: each channel, each stretch of time', async () => {
    const folder = temporaryFolder();
    record(folder, events!);
    await finishRecord(folder);
    const reader = await indexed(path.join(folder, 'record.mcap'));
    expect([...reader.channelsById.values()].map(({ topic }) => topic).sort()).toEqual(
      CHANNELS.map(({ topic }) => topic).sort(),
    );
    expect(reader.statistics?.messageCount).toBe(
      [...reader.statistics!.channelMessageCounts.values()].reduce((sum, n) => sum + n, 0n),
    );
    // All in time order, which is the order of recording.
    let numbered = 0;
    for await (const { channelId, sequence } of reader.readMessages())
      if (reader.channelsById.get(channelId)!.topic !== '/segment')
        expect(sequence).toBe(numbered++);
    expect(numbered).toBe((await readBack(folder)).state.messages);
    const decisions = stored.filter((event) => event.type === 'decision');
    const topics = CHANNELS.map(({ topic }) => topic).filter((one) =>
      one.startsWith('/decisions/'),
    );
    const told: unknown[] = [];
    for await (const { data } of reader.readMessages({ topics }))
      told.push(JSON.parse(new TextDecoder().decode(data)));
    expect(told).toEqual(decisions.map(({ decision }) => decision));
  });

  it('keeps to the second half of a record when only that is asked for by time', async () => {
    const folder = temporaryFolder();
    record(folder, events!);
    await finishRecord(folder);
    const reader = await indexed(path.join(folder, 'record.mcap'));
    const all: bigint[] = [];
    for await (const { logTime } of reader.readMessages()) all.push(logTime);
    const startTime = all[all.length >> 1]!;
    let late = 0;
    for await (const { logTime } of reader.readMessages({ startTime })) {
      expect(logTime >= startTime).toBe(true);
      late++;
    }
    expect(late).toBe(all.filter((time) => time >= startTime).length);
  });

  it('takes less than 30 MB an hour at 1 kHz', async () => {
    const folder = temporaryFolder();
    let nowMs = 0;
    const recorder = Recorder.create(folder, HEADER, { nowMs: () => nowMs });
    const sample = blank('sample');
    const minutes = 2;
    // A belt that speeds up and slows, with the jitter a board's clock and a belt have.
    let noise = 1;
    for (; nowMs < minutes * 60_000; nowMs++) {
      noise = (Math.imul(noise, 1664525) + 1013904223) >>> 0;
      sample.boardUs += 990 + (noise >>> 27);
      sample.count += Math.round(12 + 10 * Math.sin(nowMs / 2000) + (noise >>> 8) / 2 ** 22);
      recorder.sample(nowMs, sample);
      if (nowMs % 25 === 0)
        recorder.command(nowMs, 'beat', { finishedUs: sample.boardUs, wanted: 3 });
      recorder.batchEnd(false);
    }
    recorder.close('done');
    const { bytes } = await finishRecord(folder);
    expect((bytes * 60) / minutes / 1e6).toBeLessThan(30);
  });

  it('survives bit flips as a live one does: a chunk is left out and reported, others are read', async () => {
    const folder = temporaryFolder();
    const recorder = Recorder.create(folder, HEADER, { mode: 'bulk' });
    const long: Event[] = [];
    let noise = 1;
    // Several chunks of a megabyte, of what compresses badly.
    for (let input = 0; input < 60_000; input++) {
      noise = (Math.imul(noise, 1664525) + 1013904223) >>> 0;
      const sample = { ...blank('sample'), boardUs: (input * noise) >>> 0, count: noise | 0 };
      long.push({ type: 'sample', input, sample });
      tell(recorder, long.at(-1)!);
    }
    recorder.close('done');
    await finishRecord(folder);
    const file = path.join(folder, 'record.mcap');
    const bytes = fs.readFileSync(file);
    await fc.assert(
      fc.asyncProperty(fc.double({ min: 0, max: 0.999, noNaN: true }), async (where) => {
        const copy = Buffer.from(bytes);
        copy[Math.floor(where * bytes.length)]! ^= 0x24;
        fs.writeFileSync(file, copy);
        let told = 0;
        const state = (await readRecord(folder)).visit({
          sample(input, sample) {
            told++;
            const event = long[input]!;
            if (event.type !== 'sample' || event.sample.count !== sample.count)
              throw new Error(`input ${input} is not what was recorded`);
          },
        });
        if (told < long.length) expect(state.state).toBe('damaged');
      }),
      { seed: 32, numRuns: 6 },
    );
  });
});

describe('a record of several files', () => {
  it('goes on where it stopped: one list of inputs, one numbering, one clock', async () => {
    const folder = await killedAndResumed(0);
    expect(fs.readdirSync(folder).sort()).toEqual(['record-2.mcap', 'record.mcap']);
    const back = await readBack(folder);
    expect(back.events).toEqual(stored);
    expect(back.state.state).toBe('open');
    let before = 0;
    const reader = await readRecord(folder);
    reader.visit({
      sample() {
        expect(reader.timeUs).toBeGreaterThanOrEqual(before);
        before = reader.timeUs;
      },
    });
    expect(reader.header).toEqual(HEADER);
  });

  it('has the times of a record that was never interrupted, over two wraps of the board clock', async () => {
    const steady = Array.from({ length: 400 }, (_, i): Event => {
      const boardUs = (0xffff_0000 + i * 30_000_000) >>> 0;
      return { type: 'sample', input: i, sample: { ...blank('sample'), boardUs } };
    });
    const undisturbed = temporaryFolder();
    record(undisturbed, steady);
    const times: number[] = [];
    for (const folder of [undisturbed, await killedAndResumed(0, steady)]) {
      const reader = await readRecord(folder);
      reader.visit({});
      times.push(reader.timeUs - HEADER.startedAtMs * 1000);
    }
    expect(times).toEqual([399 * 30_000_000, 399 * 30_000_000]);
  });

  it('is joined into one, which still says what the first had lost, and keeps the torn file', async () => {
    const folder = await killedAndResumed(10);
    const before = await readBack(folder);
    expect(before.state.state).toBe('torn');
    const torn = fs.readFileSync(path.join(folder, 'record.mcap'));
    const finished = await finishRecord(folder);
    expect(finished.originals).toEqual(['original-1.mcap']);
    expect(fs.readdirSync(folder).sort()).toEqual(['original-1.mcap', 'record.mcap']);
    expect(fs.readFileSync(path.join(folder, 'original-1.mcap')).equals(torn)).toBe(true);
    const after = await readBack(folder);
    expect(after.events).toEqual(before.events);
    expect(after.state).toMatchObject({ state: 'torn', finished: true, found: 0 });
    expect(describeTroubles(after.state)).toEqual(describeTroubles(before.state));
    // Finishing once more changes nothing.
    const bytes = fs.readFileSync(path.join(folder, 'record.mcap'));
    await finishRecord(folder);
    expect(fs.readFileSync(path.join(folder, 'record.mcap')).equals(bytes)).toBe(true);
    expect(fs.readdirSync(folder).sort()).toEqual(['original-1.mcap', 'record.mcap']);
  });

  it('is not begun again by accident', async () => {
    const folder = await killedAndResumed(0);
    const there = fs.readFileSync(path.join(folder, 'record.mcap'));
    expect(() => Recorder.create(folder, HEADER)).toThrow(
      expect.objectContaining({ code: 'RECORD_EXISTS' }),
    );
    expect(fs.readFileSync(path.join(folder, 'record.mcap')).equals(there)).toBe(true);
  });
});

describe('finishing that is interrupted', () => {
  it.each(['half a new file', 'the new file in place, the old ones not yet removed'])(
    'with %s leaves a record that reads the same and can be finished',
    async (when) => {
      const folder = await killedAndResumed(10);
      const before = await readBack(folder);
      const copies = new Map(
        fs.readdirSync(folder).map((name) => [name, fs.readFileSync(path.join(folder, name))]),
      );
      await finishRecord(folder);
      const made = fs.readFileSync(path.join(folder, 'record.mcap'));
      if (when === 'half a new file') {
        fs.rmSync(path.join(folder, 'original-1.mcap'));
        for (const [name, bytes] of copies) fs.writeFileSync(path.join(folder, name), bytes);
        fs.writeFileSync(path.join(folder, 'finishing.mcap'), made.subarray(0, made.length >> 1));
      } else fs.writeFileSync(path.join(folder, 'record-2.mcap'), copies.get('record-2.mcap')!);
      expect((await readBack(folder)).events).toEqual(before.events);
      await finishRecord(folder);
      expect((await readBack(folder)).events).toEqual(before.events);
      expect(fs.readdirSync(folder).sort()).toEqual(['original-1.mcap', 'record.mcap']);
    },
  );

  it('by a file that cannot be read leaves the live record as it was', async () => {
    const folder = temporaryFolder();
    record(folder, events!);
    const before = fs.readFileSync(path.join(folder, 'record.mcap'));
    fs.mkdirSync(path.join(folder, 'finishing.mcap'));
    await expect(finishRecord(folder)).rejects.toThrow();
    expect(fs.readFileSync(path.join(folder, 'record.mcap')).equals(before)).toBe(true);
  });
});

describe('what cannot be read', () => {
  it('a folder without a record, no folder, a record of a later version: each its own code', async () => {
    const folder = temporaryFolder();
    const missing = expect.objectContaining({ code: 'RECORD_MISSING' });
    await expect(readRecord(folder)).rejects.toThrow(missing);
    await expect(readRecord(path.join(folder, 'none'))).rejects.toThrow(missing);
    record(folder, events!.slice(0, 40));
    const file = path.join(folder, 'record.mcap');
    const bytes = fs.readFileSync(file);
    const { crc32 } = await import('node:zlib');
    // The first chunk with another format number, and its CRC made right again.
    const start = bytes.indexOf(6, 8 + 9 + bytes.readUInt32LE(9));
    const end = start + 9 + bytes.readUInt32LE(start + 1);
    const at = bytes.indexOf('"format":1', start);
    expect(at).toBeLessThan(end);
    bytes.write('"format":9', at);
    bytes.writeUInt32LE(crc32(bytes.subarray(start + 49, end)), start + 33);
    fs.writeFileSync(file, bytes);
    expect(publicRead(file).done).toBe(true);
    await expect(readBack(folder)).rejects.toThrow(
      expect.objectContaining({ code: 'RECORD_TOO_NEW' }),
    );
  });
});
