import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { firingsOf } from '../../server/analysis/firings.js';
import { onSpans } from '../../server/analysis/pulses.js';
import { readSession } from '../../server/analysis/readSession.js';
import { recordedSession } from './recorded.js';

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
    // Two pulses that the board timed a little long, and no third of 30 us.
    expect(onSpans(100, 2_030, train)).toEqual([
      { fromUs: 100, toUs: 1_115 },
      { fromUs: 25_100, toUs: 26_115 },
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

  it('is what a wire from the output back to an input shows, trains that were ended early too', async () => {
    const rules = `title: Trains
belt: 180 cm
places:
  lit: 100 to 130 cm
rules:
  whole:
    when: reaches 40 cm
    do: pulse laser for 5 ms at 20 Hz, 4 times
  through:
    when: enters lit
    do: pulse laser for 5 ms at 20 Hz while in lit, up to 3 s
`;
    // The demo's rig: output `laser` is line 1, input `shutter` line 3; the wire takes 3 us.
    const simulated = { loopback: { output: 1, input: 3 } };
    const recorded = recordedSession({ rules, minutes: 2, simulated });
    const session = await readSession(recorded.folder);
    recorded.remove();
    const seen = session.edges.filter(({ name }) => name === 'shutter');
    const spans = firingsOf(session).flatMap((firing) => firing.spans);
    expect(spans.length).toBeGreaterThan(30);
    expect(seen.map(({ boardUs }) => boardUs - 3)).toEqual(
      spans.flatMap(({ fromUs, toUs }) => [fromUs, toUs]),
    );
    const pulses = firingsOf(session).map((firing) => firing.spans.length);
    expect(pulses).toContain(4);
    expect(pulses.some((count) => count > 4 && count < 60)).toBe(true);
  });
});
