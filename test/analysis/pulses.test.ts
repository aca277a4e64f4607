import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { onSpans } from '../../server/analysis/pulses.js';

const train = { output: 'gate', widthUs: 1_000, periodUs: 25_000, repeats: 4 };

describe('when an output was on', () => {
  it('is from the rise for as long as the board measured, for a single pulse', () => {
    const one = { ...train, repeats: 1, periodUs: 0 };
    expect(onSpans(500, 1_012, one)).toEqual([{ fromUs: 500, toUs: 1_512 }]);
    expect(onSpans(500, 1_012, undefined)).toEqual([{ fromUs: 500, toUs: 1_512 }]);
    expect(onSpans(500, 0, one)).toEqual([]);
  });

  it('is each pulse of a train, and a train that ended early lacks its last', () => {
    expect(onSpans(100, 4_000, train).map(({ fromUs }) => fromUs)).toEqual([
      ...[100, 25_100, 50_100, 75_100],
    ]);
    expect(onSpans(100, 2_400, train)).toEqual([
      { fromUs: 100, toUs: 1_100 },
      { fromUs: 25_100, toUs: 26_100 },
      { fromUs: 50_100, toUs: 50_500 },
    ]);
  });

  it('adds up to what the board measured, whatever the train', () => {
    const shape = fc.record({
      ...{ output: fc.constant('gate'), widthUs: fc.integer({ min: 1, max: 9_000 }) },
      ...{ periodUs: fc.integer({ min: 9_001, max: 90_000 }) },
      repeats: fc.integer({ min: 1, max: 50 }),
    });
    fc.assert(
      fc.property(shape, fc.integer({ min: 0, max: 500_000 }), (one, onUs) => {
        const spans = onSpans(1_000, onUs, one);
        expect(spans.reduce((sum, { fromUs, toUs }) => sum + toUs - fromUs, 0)).toBe(onUs);
        expect(spans.every(({ fromUs, toUs }) => toUs > fromUs)).toBe(true);
      }),
      { seed: 7, numRuns: 200 },
    );
  });
});
