import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { cobsBound, cobsEncode } from '../../server/wire/cobs.js';
import { blank, FrameEncoder, SHAPES } from '../../server/wire/codec.js';
import { crc16 } from '../../server/wire/crc16.js';
import { FrameDecoder } from '../../server/wire/frameDecoder.js';
import {
  type FieldType,
  MAX_FRAME_BYTES,
  MESSAGES,
  type MessageName,
} from '../../server/wire/messages.js';

interface Heard {
  name: MessageName;
  sequence: number;
  tag: number;
  message: object;
}

function listen() {
  const frames: Heard[] = [];
  const bad: string[] = [];
  const decoder = new FrameDecoder({
    frame(frame) {
      const { name } = frame.shape;
      const message = blank(name);
      frame.read(message);
      frames.push({ name, sequence: frame.sequence, tag: frame.tag, message });
    },
    bad: (why) => bad.push(why),
  });
  return { decoder, frames, bad };
}

/** Bytes of a frame before stuffing, with a good CRC, made without the encoder. */
function rawFrame(...bytes: number[]): Uint8Array {
  const crc = crc16(Uint8Array.from(bytes));
  const raw = Uint8Array.of(...bytes, crc & 0xff, crc >> 8);
  const stuffed = new Uint8Array(cobsBound(raw.length) + 1);
  const end = cobsEncode(raw, raw.length, stuffed);
  return stuffed.subarray(0, end + 1);
}

const VALUES: Record<FieldType, fc.Arbitrary<number | string>> = {
  u8: fc.integer({ min: 0, max: 0xff }),
  u16: fc.integer({ min: 0, max: 0xffff }),
  u32: fc.integer({ min: 0, max: 0xffff_ffff }),
  i32: fc.integer({ min: -0x8000_0000, max: 0x7fff_ffff }),
  text16: fc.string({ unit: 'grapheme-ascii', maxLength: 16 }),
};

const anyMessage = fc.constantFrom(...(Object.keys(MESSAGES) as MessageName[])).chain((name) =>
  fc.record({
    name: fc.constant(name),
    tag: VALUES.u16 as fc.Arbitrary<number>,
    message: fc.record(
      Object.fromEntries(SHAPES[name].fields.map((field) => [field.name, VALUES[field.type]])),
    ) as fc.Arbitrary<object>,
  }),
);
const anyMessages = fc.array(anyMessage, { minLength: 1, maxLength: 12 });

type Sent = { name: MessageName; tag: number; message: object };
function encodeAll(messages: readonly Sent[]): Uint8Array[] {
  const encoder = new FrameEncoder();
  return messages.map(({ name, message, tag }) =>
    encoder.encode(name, message as never, tag).slice(),
  );
}
const asHeard = (messages: readonly Sent[]): Heard[] =>
  messages.map(({ name, message, tag }, n) => ({ name, sequence: n & 0xff, tag, message }));

describe('the frame decoder', () => {
  test('gives back every message of every kind as it was sent', () => {
    fc.assert(
      fc.property(anyMessages, (messages) => {
        const { decoder, frames, bad } = listen();
        for (const bytes of encodeAll(messages)) decoder.push(bytes);
        expect(frames).toEqual(asHeard(messages));
        expect(bad).toEqual([]);
      }),
      { seed: 41, numRuns: 300 },
    );
  });

  test('gives the same frames however the bytes are cut', () => {
    fc.assert(
      fc.property(
        anyMessages,
        fc.array(fc.integer({ min: 1, max: 40 }), { minLength: 1 }),
        (messages, cuts) => {
          const bytes = Buffer.concat(encodeAll(messages));
          const { decoder, frames } = listen();
          for (let at = 0, n = 0; at < bytes.length; n++) {
            const size = cuts[n % cuts.length]!;
            decoder.push(bytes.subarray(at, at + size));
            at += size;
          }
          expect(frames).toEqual(asHeard(messages));
        },
      ),
      { seed: 42, numRuns: 300 },
    );
  });

  test('takes any bytes without failing, and lets nothing through but frames with a good CRC', () => {
    const rubbish = fc.array(fc.oneof(fc.constant(0), VALUES.u8 as fc.Arbitrary<number>), {
      maxLength: 60,
    });
    const spoilt = fc.tuple(anyMessage, fc.nat(), fc.integer({ min: 0, max: 255 }));
    const piece = fc.oneof(rubbish, anyMessage, spoilt);
    let accepted = 0;
    fc.assert(
      fc.property(fc.array(piece, { maxLength: 20 }), (pieces) => {
        const stream = Buffer.concat(
          pieces.map((one) => {
            if (!Array.isArray(one)) return encodeAll([one])[0]!;
            const [message, where, value] = one as [Sent, number, number];
            if (typeof message !== 'object') return Uint8Array.from(one as number[]);
            const bytes = encodeAll([message])[0]!;
            bytes[where % bytes.length] = value;
            return bytes;
          }),
        );
        const decoder = new FrameDecoder({
          frame(frame) {
            accepted++;
            // What was let through must lie on the line just as an encoder would have sent it.
            const message = blank(frame.shape.name);
            frame.read(message);
            const encoder = new FrameEncoder();
            for (let n = 0; n < frame.sequence; n++) encoder.encode('quiet', { outputs: 0 }, 0);
            const again = encoder.encode(frame.shape.name, message as never, frame.tag);
            expect(stream.includes(Buffer.from(again))).toBe(true);
          },
          bad: () => {},
        });
        decoder.push(stream);
      }),
      { seed: 43, numRuns: 1000 },
    );
    expect(accepted).toBeGreaterThan(1000);
  });

  test('decodes the next frame whole after any rubbish that ends in a delimiter', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 300 }), anyMessages, (rubbish, messages) => {
        const { decoder, frames } = listen();
        decoder.push(rubbish);
        decoder.push(Uint8Array.of(0));
        const before = frames.length;
        for (const bytes of encodeAll(messages)) decoder.push(bytes);
        expect(frames.slice(before)).toEqual(asHeard(messages));
      }),
      { seed: 44, numRuns: 500 },
    );
  });

  test('drops the one frame whose bits were flipped, and no other', () => {
    fc.assert(
      fc.property(anyMessages, fc.nat(), fc.nat(), (messages, which, where) => {
        const chunks = encodeAll(messages);
        const spoilt = which % chunks.length;
        const chunk = chunks[spoilt]!;
        // Any bit of any byte but the delimiter: that one would join two frames.
        const bit = where % ((chunk.length - 1) * 8);
        chunk[bit >> 3]! ^= 1 << (bit & 7);
        const { decoder, frames, bad } = listen();
        for (const bytes of chunks) decoder.push(bytes);
        expect(frames).toEqual(asHeard(messages).filter((_, n) => n !== spoilt));
        // One bit can make a byte zero, and so cut the frame into two bad ones.
        expect(bad.length).toBeGreaterThanOrEqual(1);
        expect(bad.length).toBeLessThanOrEqual(2);
      }),
      { seed: 45, numRuns: 1000 },
    );
  });

  test('loses two frames and no more when the delimiter between them is lost', () => {
    const { decoder, frames, bad } = listen();
    const chunks = encodeAll(
      Array.from({ length: 4 }, (_, n) => ({ name: 'quiet', tag: n, message: { outputs: n } })),
    );
    chunks[1] = chunks[1]!.subarray(0, -1);
    for (const bytes of chunks) decoder.push(bytes);
    expect(frames.map((frame) => frame.tag)).toEqual([0, 3]);
    expect(bad).toHaveLength(1);
  });

  test.each([
    ['too short', [1, 2, 3, 0]],
    ['stuffing', [9, 1, 1, 0]],
    ['too long', [...new Array(cobsBound(MAX_FRAME_BYTES) + 1).fill(1), 0]],
    ['unknown type', [...rawFrame(0x3f, 0, 0, 0)]],
    ['length', [...rawFrame(0x45, 0, 0, 0, 1, 2, 3)]],
    ['crc', [...rawFrame(0x45, 0, 0, 0, 1, 2)].map((byte, n) => (n === 1 ? byte ^ 2 : byte))],
  ])('says why it drops a frame: %s', (why, bytes) => {
    const { decoder, frames, bad } = listen();
    decoder.push(Uint8Array.from(bytes));
    expect(frames).toEqual([]);
    expect(bad).toEqual([why]);
  });

  test('finds nothing wrong with delimiters alone', () => {
    const { decoder, frames, bad } = listen();
    decoder.push(new Uint8Array(5));
    expect([frames, bad]).toEqual([[], []]);
  });

  test('forgets half a frame when a new connection begins', () => {
    const { decoder, frames, bad } = listen();
    const [bytes] = encodeAll([{ name: 'quiet', tag: 5, message: { outputs: 1 } }]);
    decoder.push(bytes!.subarray(0, 4));
    decoder.reset();
    decoder.push(bytes!);
    expect(frames).toHaveLength(1);
    expect(bad).toEqual([]);
  });

  test.each(Object.keys(MESSAGES) as MessageName[])('begins %s with its fields at zero', (name) => {
    const zeros = SHAPES[name].fields.map(({ name: field, type }) => [
      field,
      type === 'text16' ? '' : 0,
    ]);
    expect(Object.entries(blank(name))).toEqual(zeros);
  });

  test('counts sequence numbers on over 255', () => {
    const { decoder, frames } = listen();
    const encoder = new FrameEncoder();
    for (let n = 0; n < 300; n++) decoder.push(encoder.encode('quiet', { outputs: 0 }, 1));
    expect(frames.map((frame) => frame.sequence)).toEqual(
      Array.from({ length: 300 }, (_, n) => n % 256),
    );
  });

  test('takes times and counts modulo 2^32', () => {
    const { decoder, frames } = listen();
    const sample = { ...blank('sample'), boardUs: 2 ** 32 + 5, count: 2 ** 31 + 1 };
    decoder.push(new FrameEncoder().encode('sample', sample, 1));
    expect(frames[0]!.message).toMatchObject({ boardUs: 5, count: -(2 ** 31) + 1 });
  });
});
