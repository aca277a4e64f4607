/** Made-up sessions for the record's tests: seeded lists of what a loop would hand a recorder. */
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import fc from 'fast-check';
import { afterAll } from 'vitest';
import type { Decision, StampedDecision } from '../../server/session/decisions.js';
import type { RareInput } from '../../server/session/inputs.js';
import { readRecord } from '../../server/session/record/readRecord.js';
import {
  Recorder,
  type RecorderOptions,
  type RecordHeader,
} from '../../server/session/record/recorder.js';
import type { RecordState } from '../../server/session/record/recordState.js';
import type { Beat, HostMessageName, MessageOf, Sample } from '../../server/wire/messages.js';
import { identity } from './identity.js';

export const HEADER: RecordHeader = {
  session: '2026-12-01_14-03-22_m31_Test',
  startedAtMs: Date.UTC(2026, 11, 1, 14, 3, 22, 125),
  software: 'lapwing 0.1.0',
  seed: 'seed',
};

export type Event =
  | { readonly type: 'sample'; readonly input: number; readonly sample: Sample }
  | { readonly type: 'input'; readonly input: number; readonly what: RareInput }
  | {
      readonly type: 'command';
      readonly input: number;
      readonly name: HostMessageName;
      readonly message: object;
    }
  | { readonly type: 'decision'; readonly decision: StampedDecision };

const folders: string[] = [];
afterAll(() => {
  for (const folder of folders) fs.rmSync(folder, { recursive: true, force: true });
});
/** A new folder that is removed when the test file has run. */
export function temporaryFolder(): string {
  const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'lapwing-record-'));
  folders.push(folder);
  return folder;
}

const u32 = fc.nat(0xffff_ffff);
const i32 = fc.integer({ min: -0x8000_0000, max: 0x7fff_ffff });
/** Mostly what a belt does, sometimes anything at all. */
const step = fc.oneof(
  {
    weight: 12,
    arbitrary: fc.record({ us: fc.nat(6000), counts: fc.integer({ min: -40, max: 40 }) }),
  },
  { weight: 1, arbitrary: fc.record({ us: u32, counts: i32 }) },
);
const change = fc.oneof(
  { weight: 30, arbitrary: fc.constant({}) },
  {
    weight: 1,
    arbitrary: fc.record(
      {
        inputs: fc.nat(0xffff),
        outputs: fc.nat(0xffff),
        illegal: fc.nat(0xffff),
        badFrames: fc.nat(0xff),
        overruns: fc.nat(0xff),
      },
      { requiredKeys: [] },
    ),
  },
);

export const rareInput: fc.Arbitrary<RareInput> = fc.oneof(
  fc
    .record({ boardUs: u32, count: i32, input: fc.nat(7), level: fc.nat(1) })
    .map((message): RareInput => ({ kind: 'edge', message })),
  fc
    .record({
      id: u32,
      kind: fc.integer({ min: 1, max: 6 }),
      reason: fc.nat(16),
      output: fc.nat(7),
      repeated: fc.nat(1),
      boardUs: u32,
      count: i32,
      onUs: u32,
    })
    .map((message): RareInput => ({ kind: 'outcome', message })),
  fc
    .record({ fault: fc.nat(255), boardUs: u32, detail: u32 })
    .map((message): RareInput => ({ kind: 'fault', message })),
  fc
    .record({ boardUs: u32, wraps: fc.nat(0xffff) })
    .map((message): RareInput => ({ kind: 'clock', message })),
  fc.record({ bootId: u32, boardUs: u32, wraps: fc.nat(3) }).map(
    (some): RareInput => ({
      kind: 'link up',
      identity: { ...identity, ...some },
      tag: 7,
      sameBoot: false,
      overNetwork: false,
    }),
  ),
  fc.string({ unit: 'grapheme' }).map((reason): RareInput => ({ kind: 'link down', reason })),
  fc.nat(300).map((frames): RareInput => ({ kind: 'gap', frames })),
  fc.constant<RareInput>({ kind: 'bad frame', why: 'crc' }),
  fc.string().map((note): RareInput => ({ kind: 'resume', note })),
  fc.constant<RareInput>({ kind: 'begin', firstId: 1 }),
  fc.record({ text: fc.string({ unit: 'binary' }), who: fc.string() }).map(
    ({ text, who }): RareInput => ({
      kind: 'operator',
      act: { act: 'note', text },
      by: { who, from: 'dashboard 127.0.0.1' },
    }),
  ),
);

const decision: fc.Arbitrary<Decision> = fc.oneof(
  fc.nat().map((lap): Decision => ({ kind: 'lap began', lap })),
  fc.boolean().map((artefact): Decision => ({ kind: 'lick', artefact })),
  fc
    .record({ rule: fc.string(), serial: fc.nat(), reason: fc.string() })
    .map((rest): Decision => ({ kind: 'withheld', ...rest })),
  fc
    .record({
      rule: fc.constant('induce'),
      serial: fc.nat(),
      sham: fc.boolean(),
      armed: fc.boolean(),
      output: fc.constantFrom('gate', null),
      riseUs: fc.option(fc.nat()),
      placeCm: fc.option(fc.double({ noNaN: true, noDefaultInfinity: true, min: 0, max: 180 })),
      riseCm: fc.option(fc.double({ noNaN: true, noDefaultInfinity: true, min: 0, max: 180 })),
      errorMm: fc.option(fc.integer()),
    })
    .map((rest): Decision => ({ kind: 'fired', ...rest })),
);

/** What may come between two samples. */
const between = fc.oneof(
  { weight: 40, arbitrary: fc.constant({ type: 'nothing' as const }) },
  {
    weight: 4,
    arbitrary: fc.record({ type: fc.constant('beat' as const), ago: fc.nat(5000), wanted: u32 }),
  },
  { weight: 1, arbitrary: fc.record({ type: fc.constant('input' as const), what: rareInput }) },
  { weight: 1, arbitrary: fc.record({ type: fc.constant('decision' as const), decision }) },
  { weight: 1, arbitrary: fc.record({ type: fc.constant('pulse' as const), id: u32, count: i32 }) },
);

/** A session of up to `most` samples, with all that can come between them. */
export function session(most: number): fc.Arbitrary<Event[]> {
  const one = fc.record({ step, change, between });
  return fc
    .record({ start: u32, count: i32, steps: fc.array(one, { maxLength: most, size: 'max' }) })
    .map(({ start, count, steps }) => {
      const events: Event[] = [{ type: 'input', input: 0, what: { kind: 'begin', firstId: 1 } }];
      let input = 0;
      let sample: Sample = {
        boardUs: start,
        count,
        inputs: 0,
        outputs: 0,
        illegal: 0,
        badFrames: 0,
        overruns: 0,
      };
      for (const { step, change, between } of steps) {
        sample = {
          ...sample,
          ...change,
          boardUs: (sample.boardUs + step.us) >>> 0,
          count: (sample.count + step.counts) | 0,
        };
        events.push({ type: 'sample', input: ++input, sample });
        if (between.type === 'beat') {
          const finishedUs = (sample.boardUs - between.ago) >>> 0;
          const message = { finishedUs, wanted: between.wanted };
          events.push({ type: 'command', input, name: 'beat', message });
        } else if (between.type === 'input')
          events.push({ type: 'input', input: ++input, what: between.what });
        else if (between.type === 'decision') {
          const stamp = {
            input,
            boardUs: input * 1000,
            lap: 1,
            positionCm: 1.25,
            speedCmPerS: 0.1,
          };
          events.push({ type: 'decision', decision: { ...stamp, ...between.decision } });
        } else if (between.type === 'pulse') {
          const message = { ...PULSE, id: between.id, countTo: between.count };
          events.push({ type: 'command', input, name: 'pulse', message });
        }
      }
      return events;
    });
}

const PULSE: MessageOf['pulse'] = {
  id: 1,
  output: 2,
  flags: 2,
  widthUs: 300_000,
  periodUs: 0,
  repeats: 1,
  startUs: 0,
  expiryUs: 4_000_000_000,
  countFrom: -5,
  countTo: 5,
};

/** Hands one event to the recorder, through objects that are reused as a loop's are. */
const reused = { sample: {} as Sample, beat: {} as Beat };
export function tell(recorder: Recorder, event: Event): void {
  if (event.type === 'sample')
    recorder.sample(event.input, Object.assign(reused.sample, event.sample));
  else if (event.type === 'input') recorder.input(event.input, event.what);
  else if (event.type === 'decision') recorder.decision(event.decision);
  else if (event.name === 'beat')
    recorder.command(event.input, 'beat', Object.assign(reused.beat, event.message));
  else recorder.command(event.input, event.name, event.message as MessageOf['pulse']);
}

/** Records the events into the folder; live, as batches of some frames with virtual time between. */
export function record(
  folder: string,
  events: readonly Event[],
  {
    perBatch = 7,
    close = true,
    ...options
  }: RecorderOptions & { perBatch?: number; close?: boolean } = {},
): Recorder {
  let nowMs = 1000;
  const recorder = Recorder.create(folder, HEADER, { nowMs: () => nowMs, ...options });
  events.forEach((event, i) => {
    tell(recorder, event);
    if (i % perBatch !== perBatch - 1) return;
    nowMs += perBatch;
    recorder.batchEnd(event.type === 'command' && event.name !== 'beat');
  });
  recorder.tick();
  if (close) recorder.close('the rules file ended the session');
  return recorder;
}

/** Everything a reading tells, copied. */
export async function readBack(folder: string): Promise<{ events: Event[]; state: RecordState }> {
  const events: Event[] = [];
  const reader = await readRecord(folder);
  const state = reader.visit({
    sample: (input, sample) => events.push({ type: 'sample', input, sample: { ...sample } }),
    input: (input, what) => events.push({ type: 'input', input, what }),
    command: (input, name, message) =>
      events.push({ type: 'command', input, name, message: { ...message } }),
    decision: (decision) => events.push({ type: 'decision', decision }),
  });
  return { events, state };
}

/** What JSON makes of the events: `-0` and lone surrogates have no other form there. */
export function asStored(events: readonly Event[]): Event[] {
  const text = new TextDecoder();
  const encoder = new TextEncoder();
  return events.map(
    (event) => JSON.parse(text.decode(encoder.encode(JSON.stringify(event)))) as Event,
  );
}
