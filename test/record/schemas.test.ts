import fs from 'node:fs';
import path from 'node:path';
import type { McapTypes } from '@mcap/core';
import { Ajv2020 } from 'ajv/dist/2020.js';
import fc from 'fast-check';
import protobuf from 'protobufjs';
import { FileDescriptorSet, type IFileDescriptorSet } from 'protobufjs/ext/descriptor.js';
import { beforeAll, describe, expect, it } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import type { Decision } from '../../server/session/decisions.js';
import type { RareInput } from '../../server/session/inputs.js';
import { CHANNELS } from '../../server/session/record/channels.js';
import { Recorder } from '../../server/session/record/recorder.js';
import { sampleProtoText } from '../../server/session/record/sampleSchema.js';
import { blank } from '../../server/wire/codec.js';
import { type HostMessageName, MESSAGES, type Sample } from '../../server/wire/messages.js';
import { identity } from './identity.js';
import { publicRead } from './publicRead.js';
import { type Event, HEADER, record, session, temporaryFolder } from './sessions.js';

/** One decision of each kind: a new kind does not compile until it is here too. */
const DECISIONS: { readonly [K in Decision['kind']]: Extract<Decision, { kind: K }> | Decision } = {
  'session began': { kind: 'session began', title: 'Induction', seed: 'a1' },
  'session ended': { kind: 'session ended', reason: 'time' },
  'lap began': { kind: 'lap began', lap: 3 },
  seam: { kind: 'seam', event: 'accepted', slipMm: -1.5 },
  trust: { kind: 'trust', trust: 'doubtful', reason: 'a mark was missed' },
  lick: { kind: 'lick', artefact: true },
  'lick sensor': { kind: 'lick sensor', state: 'stuck' },
  asked: { kind: 'asked', rule: 'r', serial: 1, ids: [4], placeCm: null, expiryUs: 1 },
  armed: { kind: 'armed', rule: 'r', serial: 1, ids: [4, 5], placeCm: 45, expiryUs: 1 },
  disarmed: { kind: 'disarmed', rule: 'r', serial: 1, reason: 'phase' },
  fired: {
    kind: 'fired',
    rule: 'r',
    serial: 1,
    sham: false,
    armed: true,
    output: 'gate',
    riseUs: 5,
    placeCm: 45,
    riseCm: 45.02,
    errorMm: 0.2,
  },
  'pulse done': {
    kind: 'pulse done',
    rule: null,
    output: 'water',
    onUs: 40_000,
    volumeNl: 4000,
    reason: 'none',
  },
  withheld: { kind: 'withheld', rule: 'r', serial: 2, reason: 'limit' },
  missed: { kind: 'missed', rule: 'r', serial: 2, reason: 'too far' },
  refused: { kind: 'refused', rule: 'r', serial: 2, reason: 'busy' },
  uncertain: { kind: 'uncertain', rule: 'r', serial: 2, reason: 'the board restarted' },
  drawn: { kind: 'drawn', draw: 'kind', scope: 'induce', index: 0, value: 'sham' },
  'phase began': { kind: 'phase began', phase: 'baseline', index: 0, reason: 'start' },
  'cell began': { kind: 'cell began', index: 1, fields: { depth: '1.2 mm' } },
  'field predicted': {
    ...{ kind: 'field predicted', rule: 'induce', serial: 2, onsetCm: 45, peakCm: 38 },
    ...{ centreCm: 34, widthCm: 102, asymmetry: 0.1, shiftCm: 7, curve: [0.1, 1, 0.2] },
  },
  'end foreseen': { kind: 'end foreseen', laps: 5, s: null, exact: true, reason: 'lap' },
  choice: { kind: 'choice', name: 'gate_at', value: 52, state: 'in force' },
  alarm: {
    ...{ kind: 'alarm', alarm: 'still', state: 'raised', level: 'warn' },
    ...{ text: 'The belt has not moved for 5 min', remedy: 'Look at the animal.' },
  },
  note: { kind: 'note', mark: 3, markedUs: 1e6, text: 'moved the spout' },
  operator: { kind: 'operator', act: { act: 'stop everything' }, who: 'A', from: 'keyboard' },
  link: { kind: 'link', state: 'down', reason: 'silence' },
  'board fault': { kind: 'board fault', fault: 'watchdogSlots', detail: 0 },
  'frames lost': { kind: 'frames lost', frames: 2, why: 'crc' },
};

const INPUTS: readonly RareInput[] = [
  { kind: 'begin', firstId: 1 },
  { kind: 'link up', identity, tag: 99, sameBoot: false, overNetwork: false },
  { kind: 'edge', message: { boardUs: 1, count: -2, input: 3, level: 1 } },
  { kind: 'outcome', message: blank('outcome') },
  { kind: 'fault', message: blank('fault') },
  { kind: 'clock', message: blank('clock') },
  { kind: 'gap', frames: 3 },
  { kind: 'bad frame', why: 'crc' },
  { kind: 'operator', act: { act: 'press', button: 'probe' }, by: { who: 'A', from: 'box' } },
  { kind: 'resume', note: 'after 2 s' },
  { kind: 'link down', reason: 'silence' },
];

describe('what a stranger finds in a record', () => {
  const channels = new Map<number, McapTypes.Channel>();
  const schemas = new Map<number, McapTypes.Schema>();
  const messages: McapTypes.Message[] = [];
  beforeAll(() => {
    const folder = temporaryFolder();
    const recorder = Recorder.create(folder, HEADER);
    INPUTS.forEach((input, i) => {
      recorder.input(i, input);
    });
    for (const [name, spec] of Object.entries(MESSAGES))
      if (spec.from === 'host')
        recorder.command(INPUTS.length - 1, name as HostMessageName, blank(name as 'pulse'));
    const stamp = { input: 9, boardUs: 1e6, lap: 1, positionCm: null, speedCmPerS: 0 };
    for (const decision of Object.values(DECISIONS)) recorder.decision({ ...stamp, ...decision });
    recorder.sample(INPUTS.length, blank('sample'));
    recorder.close('done');
    for (const one of publicRead(path.join(folder, 'record.mcap')).records) {
      if (one.type === 'Channel') channels.set(one.id, one);
      else if (one.type === 'Schema') schemas.set(one.id, one);
      else if (one.type === 'Message') messages.push(one);
    }
  });

  it('every channel carries at least one message here, and has a schema', () => {
    const used = new Set(messages.map(({ channelId }) => channelId));
    expect([...used].sort((a, b) => a - b)).toEqual(CHANNELS.map(({ id }) => id));
    for (const { schemaId } of channels.values()) expect(schemas.has(schemaId)).toBe(true);
  });

  it('every JSON message is valid by the schema stored with it, which says what each field is', () => {
    const ajv = new Ajv2020({ strict: true, allowUnionTypes: true });
    const text = new TextDecoder();
    for (const { channelId, data } of messages) {
      const channel = channels.get(channelId)!;
      if (channel.messageEncoding !== 'json') continue;
      const { encoding, data: schemaData } = schemas.get(channel.schemaId)!;
      expect(encoding).toBe('jsonschema');
      const schema = JSON.parse(text.decode(schemaData)) as object;
      const message = JSON.parse(text.decode(data)) as Record<string, unknown>;
      const valid = ajv.compile(schema);
      expect(valid(message), `${channel.topic}: ${ajv.errorsText(valid.errors)}`).toBe(true);
      expect(Number.isInteger(message.input)).toBe(true);
      const { properties } = schema as { properties: Record<string, unknown> };
      // No field goes undescribed, and none that must be there may be left out.
      expect(Object.keys(properties)).toEqual(expect.arrayContaining(Object.keys(message)));
      const { rule: _, ...less } = message;
      if ('rule' in message) expect(valid(less)).toBe(false);
    }
  });

  it('each kind of decision has a channel of its own', () => {
    const topics = [...channels.values()].map(({ topic }) => topic);
    for (const kind of Object.keys(DECISIONS))
      expect(topics).toContain('/decisions/' + kind.replaceAll(' ', '_'));
  });

  it('has a page that names every channel, and none that is not there', () => {
    const page = fs.readFileSync(path.join(packageRoot, 'server/session/record/RECORD.md'), 'utf8');
    const named = [...page.matchAll(/^\| `(\/\S+)` +\|/gm)].map(([, topic]) => topic!);
    const kinds = CHANNELS.map(({ topic }) => topic.replace(/^\/decisions\/.*/, '/decisions/KIND'));
    expect(named).toEqual([...new Set(kinds)]);
    const topics = CHANNELS.map(({ topic }) => topic);
    for (const [, topic] of page.matchAll(/`(\/decisions\/[a-z_]+)`/g))
      expect(topics).toContain(topic);
    for (const [name] of page.matchAll(/\b(beat|board|count)_[a-z_]+/g))
      expect(sampleProtoText()).toContain(name);
  });

  it('shows the schema of samples as text too, which a protobuf compiler reads as the same', () => {
    const samples = [...channels.values()].find(({ topic }) => topic === '/inputs/samples')!;
    expect(samples.metadata.get('proto')).toBe(sampleProtoText());
    const parsed = protobuf.parse(sampleProtoText()).root.lookupType('lapwing.SampleBlock');
    const stored = sampleType(schemas.get(samples.schemaId)!);
    const shape = (type: protobuf.Type) =>
      type.fieldsArray.map(({ name, id, type: of, repeated }) => ({
        name: protobuf.util.camelCase(name),
        id,
        of,
        repeated,
      }));
    expect(shape(parsed)).toEqual(shape(stored));
  });
});

/** The message type that a general protobuf library makes of the descriptors in the record. */
function sampleType(schema: McapTypes.Schema): protobuf.Type {
  expect(schema).toMatchObject({ encoding: 'protobuf', name: 'lapwing.SampleBlock' });
  const set = FileDescriptorSet.decode(schema.data) as unknown as IFileDescriptorSet;
  const { fromDescriptor } = protobuf.Root as unknown as {
    fromDescriptor(set: IFileDescriptorSet): protobuf.Root;
  };
  return fromDescriptor(set).lookupType(schema.name);
}

/** Samples and beats of a block, by nothing but the comments in its schema. */
function integrate(block: Record<string, unknown>): Event[] {
  const field = (name: string) => Number(block[name] ?? 0);
  const array = (name: string) => (block[name] ?? []) as number[];
  const events: Event[] = [];
  let boardUs = field('board_us');
  let count = field('count');
  const after = array('beat_after');
  for (let i = 0; i < field('samples'); i++) {
    if (i > 0) {
      boardUs = (boardUs + array('board_us_deltas')[i - 1]!) % 2 ** 32;
      count = (count + array('count_deltas')[i - 1]!) | 0;
    }
    const sample = {
      boardUs,
      count,
      inputs: field('inputs'),
      outputs: field('outputs'),
      illegal: field('illegal'),
      badFrames: field('bad_frames'),
      overruns: field('overruns'),
    } satisfies Sample;
    const input = field('input') + i;
    events.push({ type: 'sample', input, sample });
    after.forEach((index, beat) => {
      if (index !== i) return;
      const finishedUs = (boardUs + array('beat_finished_us')[beat]! + 2 ** 32) % 2 ** 32;
      const message = { finishedUs, wanted: array('beat_wanted')[beat]! };
      events.push({ type: 'command', input, name: 'beat', message });
    });
  }
  return events;
}

describe('blocks of samples', () => {
  it('give the same samples and heartbeats to a general protobuf reader', () => {
    fc.assert(
      fc.property(session(300), (events) => {
        const folder = temporaryFolder();
        record(folder, events, { mode: 'bulk' });
        const { records } = publicRead(path.join(folder, 'record.mcap'));
        const channel = records.find(
          (one): one is McapTypes.TypedMcapRecords['Channel'] =>
            one.type === 'Channel' && one.topic === '/inputs/samples',
        )!;
        const schema = records.find((one) => one.type === 'Schema' && one.id === channel.schemaId);
        const type = sampleType(schema as McapTypes.TypedMcapRecords['Schema']);
        const told = records.flatMap((one) =>
          one.type === 'Message' && one.channelId === channel.id
            ? integrate(type.toObject(type.decode(one.data), { longs: Number }))
            : [],
        );
        // A heartbeat that followed something else than a sample has a message of its own.
        const wanted = events.filter(
          (event, i) =>
            event.type === 'sample' ||
            (event.type === 'command' && event.name === 'beat' && events[i - 1]!.type === 'sample'),
        );
        expect(told).toEqual(wanted);
      }),
      { seed: 10, numRuns: 40 },
    );
  });

  it('take about 3 bytes a sample at 1 kHz', () => {
    const folder = temporaryFolder();
    const recorder = Recorder.create(folder, HEADER, { mode: 'bulk' });
    const before = recorder.bytes;
    const sample = blank('sample');
    for (let i = 0; i < 100_000; i++) {
      sample.boardUs += 990 + (i % 21);
      sample.count += i % 30;
      recorder.sample(i, sample);
    }
    recorder.close('done');
    expect((recorder.bytes - before) / 100_000).toBeLessThan(3.2);
  });
});
