import fs from 'node:fs';
import path from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { readRecord } from '../../server/session/record/readRecord.js';
import { describeTroubles } from '../../server/session/record/recordState.js';
import { publicRead } from './publicRead.js';
import { asStored, type Event, readBack, record, session, temporaryFolder } from './sessions.js';

const [events] = fc
  .sample(session(1500), { seed: 21, numRuns: 40 })
  .sort((a, b) => b.length - a.length);
const stored = asStored(events!);
/** As text, since comparing objects would be most of the time of these tests. */
const texts = stored.map((event) => JSON.stringify(event));
const textsOf = (list: readonly Event[]) => list.map((event) => JSON.stringify(event));

/** A live record of the events, as bytes, and a folder to put altered copies of it in. */
function made(close: boolean) {
  const folder = temporaryFolder();
  record(folder, events!, { close });
  const file = path.join(folder, 'record.mcap');
  const bytes = fs.readFileSync(file);
  // Another process's, for all that the reader knows: reading never asks who records.
  return { folder, file, bytes };
}

function lastInput(list: readonly Event[]): number {
  for (let i = list.length - 1; i >= 0; i--) {
    const event = list[i]!;
    if (event.type === 'sample' || event.type === 'input') return event.input;
  }
  return -1;
}

// Thousands of files are written and read.
const PATIENT = { timeout: 120_000 };

/** Where each chunk of a whole live file ends. */
function chunkEnds(bytes: Buffer): number[] {
  const ends: number[] = [];
  // Magic, then records: opcode, length u64, content (https://mcap.dev/spec).
  for (let at = 8; at < bytes.length; ) {
    const next = at + 9 + bytes.readUInt32LE(at + 1);
    if (bytes[at] === 6) ends.push(next);
    at = next;
  }
  return ends;
}

describe('a record torn anywhere', PATIENT, () => {
  const { folder, file, bytes } = made(false);

  /** Cuts the record and checks all that is promised of what is left; returns how much that is. */
  async function cutAt(offset: number): Promise<number> {
    fs.writeFileSync(file, bytes.subarray(0, offset));
    const back = await readBack(folder);
    expect(textsOf(back.events).join()).toBe(texts.slice(0, back.events.length).join());
    expect(back.state.lastInput).toBe(lastInput(back.events));
    // Exactly what the library's own reader gets of every whole chunk, so nothing was left behind.
    if (offset >= 8) {
      const numbered = publicRead(file).records.filter((one) => one.type === 'Message').length - 1;
      expect(back.state.messages).toBe(Math.max(numbered, 0));
    }
    const [trouble, more] = back.state.troubles;
    expect(more).toBeUndefined();
    expect(trouble).toMatchObject({ file: 'record.mcap', lastInput: back.state.lastInput });
    expect(['torn', 'open']).toContain(back.state.state);
    if (trouble?.kind === 'torn') expect(trouble.bytesLost).toBeLessThanOrEqual(offset);
    return back.events.length;
  }

  it('gives back all before the last whole chunk, for a cut at every byte of a stretch', async () => {
    const ends = chunkEnds(bytes);
    // The shortest chunk, from before the end of the one in front of it to after its own.
    const length = (i: number) => ends[i + 1]! - ends[i]!;
    let shortest = 1;
    for (let i = 2; i + 1 < ends.length; i++) if (length(i) < length(shortest)) shortest = i;
    let before = 0;
    let steps = 0;
    for (let offset = ends[shortest]! - 4; offset < ends[shortest + 1]! + 4; offset++) {
      const count = await cutAt(offset);
      expect(count).toBeGreaterThanOrEqual(before);
      if (count > before) steps++;
      before = count;
    }
    // What is there at first, and what each of the two ends in the stretch adds.
    expect(steps).toBe(3);
  });

  it('does so for a cut anywhere from the first byte to the last', async () => {
    await fc.assert(
      fc.asyncProperty(fc.nat(bytes.length), async (offset) => {
        await cutAt(offset);
      }),
      { seed: 22, numRuns: 150, examples: [[0], [1], [8], [9], [bytes.length]] },
    );
  });

  it('loses no chunk: each cut at a chunk end gives everything written up to it', async () => {
    fs.writeFileSync(file, bytes);
    expect((await readBack(folder)).events).toEqual(stored);
  });

  it('says in a sentence what is missing', async () => {
    fs.writeFileSync(file, bytes.subarray(0, bytes.length - 3));
    const { state } = await readBack(folder);
    const [sentence] = describeTroubles(state);
    expect(sentence).toMatch(
      /^record\.mcap stops in the middle of a chunk: its last \d+ bytes cannot be read; everything up to input \d+ is there\.$/,
    );
    fs.writeFileSync(file, bytes);
    expect(describeTroubles((await readBack(folder)).state)[0]).toMatch(/was never closed/);
  });
});

describe('a record with flipped bits', PATIENT, () => {
  const known = new Set(texts);
  const { folder, file, bytes } = made(true);

  it('never tells anything that was not recorded, and says so whenever anything is missing', async () => {
    let damaged = 0;
    await fc.assert(
      fc.asyncProperty(
        fc.nat(bytes.length - 1),
        fc.integer({ min: 1, max: 255 }),
        async (at, flip) => {
          const copy = Buffer.from(bytes);
          copy[at]! ^= flip;
          fs.writeFileSync(file, copy);
          const back = await readBack(folder);
          // What is told is what was recorded, less one stretch.
          const told = textsOf(back.events);
          const missing = texts.length - told.length;
          let same = 0;
          while (same < told.length && told[same] === texts[same]) same++;
          for (let i = same; i < told.length; i++)
            if (told[i] !== texts[i + missing]) expect(told[i]).toBe(texts[i + missing]);
          if (missing > 0) {
            damaged++;
            expect(back.state.state).toBe('damaged');
            // Only one chunk of 20 ms is gone, not what follows it.
            expect(missing).toBeLessThan(120);
            expect(describeTroubles(back.state).join()).toMatch(/cannot be read|missing/);
          }
        },
      ),
      { seed: 23, numRuns: 250 },
    );
    // The rest fell into the schemas and the closing bytes.
    expect(damaged).toBeGreaterThan(50);
  });

  it('reports the time span and the inputs on both sides of a damaged chunk, and reads on', async () => {
    const copy = Buffer.from(bytes);
    // Near the end of the middle chunk, where its messages are: its head's times stand outside the CRC.
    const at = chunkEnds(bytes).find((end) => end > bytes.length >> 1)! - 30;
    copy[at]! ^= 0x10;
    fs.writeFileSync(file, copy);
    const reader = await readRecord(folder);
    const before: number[] = [];
    const state = reader.visit({ sample: () => before.push(reader.timeUs) });
    const damage = state.troubles.find(({ kind }) => kind === 'damaged');
    const gap = state.troubles.find(({ kind }) => kind === 'missing');
    if (damage?.kind !== 'damaged' || gap?.kind !== 'missing') throw new Error('not reported');
    expect(damage.fromUs).toBeLessThanOrEqual(damage.toUs!);
    expect(gap.fromUs).toBe(damage.fromUs);
    expect(gap.toUs).toBe(damage.toUs);
    expect(before.some((time) => time <= damage.fromUs!)).toBe(true);
    expect(before.some((time) => time >= damage.toUs!)).toBe(true);
    expect(gap.nextInput).toBeGreaterThan(gap.lastInput);
  });

  it('survives a stretch of zeros or noise longer than a chunk', async () => {
    await fc.assert(
      fc.asyncProperty(
        fc.nat(bytes.length - 1),
        fc.oneof(
          fc.constant(new Uint8Array(5000)),
          fc.uint8Array({ minLength: 1, maxLength: 6000 }),
        ),
        async (at, noise) => {
          const copy = Buffer.from(bytes);
          copy.set(noise.subarray(0, copy.length - at), at);
          fs.writeFileSync(file, copy);
          const { events: told, state } = await readBack(folder);
          expect(textsOf(told).every((text) => known.has(text))).toBe(true);
          if (told.length < stored.length) expect(state.state).not.toBe('whole');
        },
      ),
      { seed: 24, numRuns: 60 },
    );
  });

  it('survives bytes inserted and bytes taken out', async () => {
    const cases: Buffer[] = [];
    for (let at = 100; at < bytes.length; at += bytes.length >> 4) {
      cases.push(
        Buffer.concat([bytes.subarray(0, at), Buffer.from([6, 0, 0]), bytes.subarray(at)]),
      );
      cases.push(Buffer.concat([bytes.subarray(0, at), bytes.subarray(at + 2)]));
    }
    for (const copy of cases) {
      fs.writeFileSync(file, copy);
      const { events: told, state } = await readBack(folder);
      expect(told.length).toBeGreaterThan(stored.length - 120);
      if (told.length < stored.length) expect(state.state).toBe('damaged');
    }
  });
});
