import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { crc16 } from '../../server/wire/crc16.js';

const ascii = (text: string) => Uint8Array.from(text, (letter) => letter.charCodeAt(0));

describe('the CRC', () => {
  // Source: G. Cook, Catalogue of parametrised CRC algorithms, entry CRC-16/IBM-3740 (alias
  // CRC-16/CCITT-FALSE): check 0x29b1, init 0xffff, residue 0x0000.
  test('gives the check value of the CRC catalogue', () => {
    expect(crc16(ascii('123456789'))).toBe(0x29b1);
  });

  test('of nothing is the initial value', () => {
    expect(crc16(new Uint8Array(0))).toBe(0xffff);
  });

  test('of a message followed by its own CRC, high byte first, is the residue 0', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 80 }), (bytes) => {
        const crc = crc16(bytes);
        expect(crc16(Uint8Array.of(...bytes, crc >> 8, crc & 0xff))).toBe(0);
      }),
      { seed: 11 },
    );
  });

  test('looks at the given part of a buffer only', () => {
    expect(crc16(ascii('xx123456789yy'), 2, 11)).toBe(0x29b1);
  });

  // A 16-bit CRC finds every burst of at most 16 bits. Source: Peterson and Brown, Cyclic Codes for
  // Error Detection, Proceedings of the IRE, 1961.
  test('changes with every burst of errors of up to 16 bits', () => {
    fc.assert(
      fc.property(
        fc.uint8Array({ minLength: 3, maxLength: 64 }),
        fc.integer({ min: 1, max: 0xffff }),
        fc.nat(),
        (bytes, burst, where) => {
          const spoilt = bytes.slice();
          const bit = where % (bytes.length * 8 - 15);
          for (let i = 0; i < 16; i++) {
            if ((burst >> i) & 1) spoilt[(bit + i) >> 3]! ^= 0x80 >> ((bit + i) & 7);
          }
          expect(crc16(spoilt)).not.toBe(crc16(bytes));
        },
      ),
      { seed: 12, numRuns: 2000 },
    );
  });
});
