import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { Strip, stretchesOf } from '../../dashboard/model/strip.js';
import type { BenchItem } from '../../server/loop/protocol.js';

const board = { model: 'b', boardId: 0, firmware: 1, simulated: false };
const now = (atUs: number) => ({ atUs, count: 0, board });
const edge = (atUs: number, level: 0 | 1, line = 0): BenchItem => ({
  ...{ is: 'edge', atUs, count: 0, line, level },
});

describe('the strip of inputs and outputs', () => {
  test('shows when a line was on, its first stretch open to the left', () => {
    const strip = new Strip();
    strip.take(now(9e6), [edge(1e6, 0), edge(3e6, 1), edge(4e6, 0), edge(8e6, 1)], 0);
    expect(stretchesOf(strip.inputs.get(0), 0, 9e6, false)).toEqual([
      { fromUs: 0, toUs: 1e6 },
      { fromUs: 3e6, toUs: 4e6 },
      { fromUs: 8e6, toUs: 9e6 },
    ]);
  });

  test('shows a line that never changed as what it is now', () => {
    expect(stretchesOf(undefined, 0, 5, true)).toEqual([{ fromUs: 0, toUs: 5 }]);
    expect(stretchesOf(undefined, 0, 5, false)).toEqual([]);
  });

  test('keeps no more than the seconds that it shows, however long it is watched', () => {
    const strip = new Strip();
    for (let s = 0; s < 600; s++) {
      const items = Array.from({ length: 40 }, (_, n) => edge(s * 1e6 + n * 20_000, n % 2 ? 0 : 1));
      strip.take(now(s * 1e6 + 900_000), items, s * 1_000);
    }
    expect(strip.inputs.get(0)!.atUs.length).toBeLessThan(40 * 14);
  });

  test('forgets what was when the board begins anew', () => {
    const strip = new Strip();
    strip.take(now(60e6), [edge(59e6, 1)], 0);
    strip.take(now(1e6), [], 100);
    expect(strip.inputs.size).toBe(0);
  });

  test('runs on between two words of the service, and not for ever', () => {
    const strip = new Strip();
    expect(strip.edgeUs(0)).toBeUndefined();
    strip.take(now(10e6), [], 1_000);
    expect(strip.edgeUs(1_100)! - strip.edgeUs(1_000)!).toBe(100_000);
    expect(strip.edgeUs(60_000)).toBe(strip.edgeUs(2_000));
  });

  test('never shows a stretch beyond its edges, nor two that overlap', () => {
    fc.assert(
      fc.property(
        fc.array(fc.tuple(fc.integer({ min: 0, max: 20e6 }), fc.boolean()), { maxLength: 60 }),
        (changes) => {
          const sorted = [...changes].sort(([a], [b]) => a - b);
          const strip = new Strip();
          const items = sorted.map(
            ([atUs, on]): BenchItem => ({ is: 'output', atUs, line: 3, on }),
          );
          strip.take(now(20e6), items, 0);
          const shown = stretchesOf(strip.outputs.get(3), 10e6, 20e6, false);
          let before = 10e6;
          for (const { fromUs, toUs } of shown) {
            expect(fromUs).toBeGreaterThanOrEqual(before);
            expect(toUs).toBeGreaterThanOrEqual(fromUs);
            before = toUs;
          }
          expect(before).toBeLessThanOrEqual(20e6);
        },
      ),
      { seed: 8, numRuns: 200 },
    );
  });
});
