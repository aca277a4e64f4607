import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { extend32, fromWraps } from '../../server/wire/time.js';

const WRAP = 2 ** 32;
const HALF = 2 ** 31;
const time = fc.integer({ min: 0, max: 2 ** 50 });

describe('extended time', () => {
  test('finds the true time from its low 32 bits while less than 2^31 lies between', () => {
    fc.assert(
      fc.property(time, fc.integer({ min: -HALF, max: HALF - 1 }), (previous, step) => {
        const now = previous + step;
        const raw = ((now % WRAP) + WRAP) % WRAP;
        expect(extend32(previous, raw)).toBe(now);
      }),
      { seed: 31, numRuns: 2000 },
    );
  });

  test('is the same for a raw value read as signed or unsigned', () => {
    fc.assert(
      fc.property(time, fc.integer({ min: 0, max: WRAP - 1 }), (previous, raw) => {
        expect(extend32(previous, raw | 0)).toBe(extend32(previous, raw));
      }),
      { seed: 32 },
    );
  });

  test('stays as it is for its own low 32 bits', () => {
    fc.assert(
      fc.property(time, (now) => {
        expect(extend32(now, now % WRAP)).toBe(now);
      }),
      { seed: 33 },
    );
  });

  test('goes on over the wrap of board time, and of counts below zero', () => {
    expect(extend32(0xffff_ff00, 0x10)).toBe(WRAP + 0x10);
    expect(extend32(WRAP + 0x10, 0xffff_ff00)).toBe(0xffff_ff00);
    expect(extend32(2_147_483_640, -2_147_483_640)).toBe(2_147_483_656);
    expect(extend32(-2_147_483_640, 2_147_483_640)).toBe(-2_147_483_656);
  });

  test('after 40 silent minutes is wrong, which is why identity carries the wraps', () => {
    const before = 1_000_000;
    const now = before + 40 * 60e6;
    expect(extend32(before, now % WRAP)).not.toBe(now);
    expect(fromWraps(Math.floor(now / WRAP), now % WRAP)).toBe(now);
  });

  test('from wraps and a raw reading is exact', () => {
    fc.assert(
      fc.property(time, (now) => {
        expect(fromWraps(Math.floor(now / WRAP), (now % WRAP) | 0)).toBe(now);
      }),
      { seed: 34 },
    );
  });
});
