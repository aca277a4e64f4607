import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { cobsBound, cobsDecodeInPlace, cobsEncode } from '../../server/wire/cobs.js';

function encode(bytes: Uint8Array): number[] {
  const target = new Uint8Array(cobsBound(bytes.length));
  return [...target.subarray(0, cobsEncode(bytes, bytes.length, target))];
}

function decode(bytes: readonly number[]): number[] | undefined {
  const buffer = Uint8Array.from(bytes);
  const length = cobsDecodeInPlace(buffer, buffer.length);
  return length < 0 ? undefined : [...buffer.subarray(0, length)];
}

const hex = (text: string) => text.split(' ').map((byte) => Number.parseInt(byte, 16));
const run = (length: number, from = 1) => Array.from({ length }, (_, n) => ((n + from) % 255) + 1);

describe('COBS', () => {
  // Source: S. Cheshire and M. Baker, Consistent Overhead Byte Stuffing, IEEE/ACM Transactions on
  // Networking 7(2), 1999, the example of a packet's first bytes; from memory.
  test("encodes the paper's example, the start of an IP packet", () => {
    const packet = hex('45 00 00 2C 4C 79 00 00 40 06 4F 37');
    const stuffed = hex('02 45 01 04 2C 4C 79 01 05 40 06 4F 37');
    expect(encode(Uint8Array.from(packet))).toEqual(stuffed);
    expect(decode(stuffed)).toEqual(packet);
  });

  // Source: the same paper, its table of code bytes: 0x01 is a lone zero, n is n - 1 bytes and a
  // zero, 0xFF is 254 bytes without one; the packet's end counts as a zero that is not sent.
  test.each([
    ['nothing', [], [1]],
    ['a lone zero', [0], [1, 1]],
    ['two zeros', [0, 0], [1, 1, 1]],
    ['one byte', [7], [2, 7]],
    ['one byte and a zero', [7, 0], [2, 7, 1]],
    ['253 bytes', run(253), [254, ...run(253)]],
    ['254 bytes', run(254), [255, ...run(254)]],
    ['254 bytes and a zero', [...run(254), 0], [255, ...run(254), 1, 1]],
    ['255 bytes', run(255), [255, ...run(254), 2, run(255)[254]!]],
  ])('encodes %s by the table of code bytes', (_, bytes, stuffed) => {
    expect(encode(Uint8Array.from(bytes))).toEqual(stuffed);
    expect(decode(stuffed)).toEqual(bytes);
  });

  test('gives back what was encoded, without a zero and within its bound', () => {
    fc.assert(
      fc.property(
        fc.array(fc.oneof(fc.constant(0), fc.integer({ min: 0, max: 255 })), { maxLength: 600 }),
        (bytes) => {
          const stuffed = encode(Uint8Array.from(bytes));
          expect(stuffed).not.toContain(0);
          expect(stuffed.length).toBeLessThanOrEqual(cobsBound(bytes.length));
          expect(decode(stuffed)).toEqual(bytes);
        },
      ),
      { seed: 21, numRuns: 500 },
    );
  });

  test('refuses code bytes that do not add up, and zeros inside', () => {
    expect(decode([5, 1, 2])).toBeUndefined();
    expect(decode([3, 1, 0])).toBeUndefined();
    expect(decode([0])).toBeUndefined();
  });

  test('decodes any bytes to a shorter result or to nothing', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 300 }), (bytes) => {
        const decoded = decode([...bytes]);
        if (decoded !== undefined) expect(decoded.length).toBeLessThanOrEqual(bytes.length);
      }),
      { seed: 22, numRuns: 1000 },
    );
  });
});
