/** Parts of the board by themselves, where the whole board would hide a fault in one of them. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { OutputLine } from '../../hardware-sim/board/outputLine.js';
import { SeenIds } from '../../hardware-sim/board/seenIds.js';
import { multiplyHigh, Xorshift32 } from '../../hardware-sim/board/xorshift.js';
import { blank } from '../../server/wire/codec.js';
import { REASON } from '../../server/wire/messages.js';

describe('the cut-off', () => {
  test('drops an output at its longest time on, even if a wider pulse got past every check', () => {
    const line = new OutputLine();
    line.configure({ ...blank('configure'), longestOnUs: 5000, allowanceUs: 1e6 });
    line.begin(1, { widthUs: 80_000, periodUs: 0, repeats: 1 }, 1000, 0);
    expect(line.nextUs).toBe(6000);
    expect(line.fall(6000)).toBe(true);
    expect(line.ending).toBe(REASON.longestOn);
  });

  test('ends the whole train, not one pulse of it', () => {
    const line = new OutputLine();
    line.configure({ ...blank('configure'), longestOnUs: 5000, allowanceUs: 1e6 });
    line.begin(1, { widthUs: 80_000, periodUs: 90_000, repeats: 9 }, 0, 0);
    expect(line.fall(5000)).toBe(true);
  });
});

describe('the ids seen', () => {
  test('are those that a host gave, as far as the window reaches', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 0, max: 2 ** 32 - 1 - 150 }),
        fc.array(fc.integer({ min: 1, max: 150 }), { maxLength: 200 }),
        (base, steps) => {
          const ids = steps.map((step) => base + step);
          const seen = new SeenIds();
          const model = new Set<number>();
          let highest = 0;
          for (const id of ids) {
            const expected = id < highest - 64 ? 'old' : model.has(id) ? 'seen' : 'new';
            expect(seen.take(id)).toBe(expected);
            if (expected === 'new') model.add(id);
            highest = Math.max(highest, id);
          }
        },
      ),
      { seed: 101, numRuns: 500 },
    );
  });
});

describe('the random generator', () => {
  test('multiplies exactly', () => {
    const word = fc.integer({ min: 0, max: 2 ** 32 - 1 });
    fc.assert(
      fc.property(word, word, (a, b) => {
        expect(multiplyHigh(a, b)).toBe(Number((BigInt(a) * BigInt(b)) >> 32n));
      }),
      { seed: 102, numRuns: 2000 },
    );
  });

  test('stays within its bounds and reaches both', () => {
    const random = new Xorshift32(7);
    const drawn = new Set(Array.from({ length: 500 }, () => random.between(3, 7)));
    expect([...drawn].sort()).toEqual([3, 4, 5, 6, 7]);
  });

  test('takes seed 0 as 1, for it would stay 0', () => {
    expect(new Xorshift32(0).next()).toBe(new Xorshift32(1).next());
  });
});
