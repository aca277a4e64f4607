import path from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { CHANNELS } from '../../server/session/record/channels.js';
import { Recorder } from '../../server/session/record/recorder.js';
import { blank } from '../../server/wire/codec.js';
import { publicRead } from './publicRead.js';
import { asStored, HEADER, readBack, record, session, temporaryFolder } from './sessions.js';

describe('a record read back', () => {
  it.each(['live', 'bulk'] as const)(
    'tells in order exactly what a %s recorder was told, whatever that was',
    async (mode) => {
      await fc.assert(
        fc.asyncProperty(
          session(400),
          fc.integer({ min: 1, max: 40 }),
          async (events, perBatch) => {
            const folder = temporaryFolder();
            record(folder, events, { mode, perBatch });
            const back = await readBack(folder);
            expect(back.events).toEqual(asStored(events));
            expect(back.state).toMatchObject({ state: 'whole', troubles: [], finished: false });
            const inputs = events.flatMap((event) =>
              event.type === 'sample' || event.type === 'input' ? [event.input] : [],
            );
            expect(back.state.lastInput).toBe(inputs.at(-1));
          },
        ),
        { seed: 8, numRuns: 40 },
      );
    },
  );

  it('keeps blocks longer than a second of samples in order', async () => {
    const sample = { inputs: 1, outputs: 2, illegal: 3, badFrames: 4, overruns: 5 };
    const events = Array.from({ length: 5003 }, (_, i) => ({
      type: 'sample' as const,
      input: i,
      sample: { ...sample, boardUs: (0xffff_0000 + i * 1000) >>> 0, count: 7 - i * 3 },
    }));
    const folder = temporaryFolder();
    record(folder, events, { mode: 'bulk' });
    expect((await readBack(folder)).events).toEqual(events);
  });
});

describe('a command', () => {
  it('is recorded as the wire carries it, though the host reckons in extended time', async () => {
    const folder = temporaryFolder();
    const recorder = Recorder.create(folder, HEADER);
    const late = 3 * 2 ** 32 + 77;
    recorder.input(0, { kind: 'begin', firstId: 1 });
    recorder.command(0, 'pulse', { ...blank('pulse'), expiryUs: late, countFrom: -3 });
    recorder.command(0, 'beat', { finishedUs: late, wanted: 1 });
    recorder.sample(1, { ...blank('sample'), boardUs: 100 });
    recorder.command(1, 'beat', { finishedUs: late, wanted: 1 });
    recorder.close('done');
    const { events } = await readBack(folder);
    const sent = events.flatMap((event) => (event.type === 'command' ? [event.message] : []));
    const beat = { finishedUs: 77, wanted: 1 };
    expect(sent).toEqual([{ ...blank('pulse'), expiryUs: 77, countFrom: -3 }, beat, beat]);
  });
});

describe('a live record in the public MCAP reader', () => {
  it('is a whole file with nothing but known channels, times that never fall, and numbers in a row', () => {
    fc.assert(
      fc.property(session(200), (events) => {
        const folder = temporaryFolder();
        record(folder, events);
        const { records, done } = publicRead(path.join(folder, 'record.mcap'));
        expect(done).toBe(true);
        const channels = records.filter((one) => one.type === 'Channel');
        expect(channels.map(({ topic }) => topic)).toEqual(CHANNELS.map(({ topic }) => topic));
        const messages = records.filter((one) => one.type === 'Message');
        const segment = CHANNELS.find(({ topic }) => topic === '/segment')!.id;
        let before = BigInt(HEADER.startedAtMs) * 1_000_000n;
        let number = 0;
        for (const { logTime, publishTime, sequence, channelId } of messages) {
          expect(logTime >= before && publishTime === logTime).toBe(true);
          before = logTime;
          expect(sequence).toBe(channelId === segment ? number : number++);
        }
      }),
      { seed: 9, numRuns: 20 },
    );
  });

  it('names the time of a message by board time since the session began, to the microsecond', () => {
    const folder = temporaryFolder();
    const sample = { count: 0, inputs: 0, outputs: 0, illegal: 0, badFrames: 0, overruns: 0 };
    // Across the wrap of the board's 32-bit clock.
    record(folder, [
      { type: 'sample', input: 0, sample: { ...sample, boardUs: 0xffff_ff00 } },
      { type: 'sample', input: 1, sample: { ...sample, boardUs: 0x100 } },
      {
        type: 'input',
        input: 2,
        what: { kind: 'edge', message: { boardUs: 0x1234, count: 0, input: 0, level: 1 } },
      },
    ]);
    const { records } = publicRead(path.join(folder, 'record.mcap'));
    const times = records.flatMap((one) =>
      one.type === 'Message' ? [Number(one.logTime / 1000n) - HEADER.startedAtMs * 1000] : [],
    );
    expect(times).toEqual([0, 0x200, 0x1334, 0x1334]);
  });
});
