import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  backlashCounts,
  fitLaps,
  offsetCm,
  scaleOf,
  turnedWay,
} from '../../server/calibrate/belt/beltFit.js';
import { type MarkEdge, passesOf } from '../../server/calibrate/belt/passes.js';
import { fitLatencies, latenessUs } from '../../server/calibrate/latency/latencyFit.js';
import { type Contact, contactsOf } from '../../server/calibrate/lick/contacts.js';
import { echoRate, fitLicks } from '../../server/calibrate/lick/lickFit.js';

const LAP = 4_500;
const MARK = 50;
const CHATTER = 7;

/** Edges of a mark that goes by at these counts, each edge bouncing `bounces` times. */
function edgesOf(passes: readonly (readonly [number, number])[], bounces = 0): MarkEdge[] {
  return passes.flatMap(([from, to]) => {
    const way = Math.sign(to - from);
    const edge = (count: number, level: 0 | 1): MarkEdge[] => {
      const edges: MarkEdge[] = [{ count, level }];
      for (let n = 1; n <= bounces; n++) {
        edges.push({ count: count + way * n, level: level === 1 ? 0 : 1 });
        edges.push({ count: count + way * n, level });
      }
      return edges;
    };
    return [...edge(from, 1), ...edge(to, 0)];
  });
}
const laps = (n: number, way = 1) =>
  Array.from({ length: n }, (_, i) => [100 + way * i * LAP, 100 + way * (i * LAP + MARK)] as const);

describe('laps turned by hand', () => {
  it('are counted from the leading edge, however either edge bounces', () => {
    fc.assert(
      fc.property(fc.integer({ min: 0, max: 5 }), fc.boolean(), (bounces, back) => {
        const way = back ? -1 : 1;
        const passes = passesOf(edgesOf(laps(6, way), bounces), CHATTER);
        expect(passes).toHaveLength(6);
        expect(turnedWay(passes)).toBe(way);
        const fit = fitLaps(passes, way)!;
        expect(fit.laps.map((lap) => lap.counts)).toEqual([LAP, LAP, LAP, LAP, LAP]);
        expect(fit.lapCounts).toBe(LAP);
      }),
      { seed: 3, numRuns: 40 },
    );
  });

  it('that miss a mark lie out, and are left out of the median', () => {
    const some = laps(10).filter((_, i) => i !== 4);
    const fit = fitLaps(passesOf(edgesOf(some), CHATTER), 1)!;
    expect(fit.laps.map((lap) => lap.outlying)).toEqual([
      ...[false, false, false, true, false, false, false, false],
    ]);
    expect(fit.lapCounts).toBe(LAP);
    expect(fit.markCounts).toBe(MARK);
    // No better than two rounded counts allow: sqrt(1/6) / sqrt(7) times 1.25.
    expect(fit.lapCountsError).toBeCloseTo(0.193, 3);
  });

  it('are not counted over a turning back', () => {
    const passes = passesOf(
      edgesOf([
        [100, 150],
        [147, 97],
        [100, 150],
        [100 + LAP, 150 + LAP],
        [100 + 2 * LAP, 150 + 2 * LAP],
      ]),
      CHATTER,
    );
    expect(fitLaps(passes, 1)!.laps.map((lap) => lap.counts)).toEqual([LAP, LAP]);
  });

  it('say nothing before there are two', () => {
    expect(fitLaps(passesOf(edgesOf(laps(2)), CHATTER), 1)).toBeUndefined();
  });

  it('a mark entered and left by the same end is no pass', () => {
    expect(passesOf(edgesOf([[100, 103]]), CHATTER)).toEqual([]);
  });
});

describe('what the belt calibration makes of them', () => {
  it('play between belt and encoder, from the leading edge met both ways', () => {
    const passes = passesOf(
      edgesOf([
        [100, 150],
        [155, 105],
        [101, 151],
        [100 + LAP, 150 + LAP],
        [154 + LAP, 104 + LAP],
      ]),
      CHATTER,
    );
    expect(backlashCounts(passes, 1, LAP)).toEqual([5, 4]);
  });

  it('counts a cm, with the errors of counts and of the tape in quadrature', () => {
    const scale = scaleOf({ lapCounts: 4_500, lapCountsError: 4.5 }, 180, 0.2);
    expect(scale.countsPerCm).toBe(25);
    expect(scale.countsPerCmError / 25).toBeCloseTo(Math.hypot(0.001, 0.2 / 180), 9);
  });

  it('an offset below 0 where the seam comes to the animal after the sensor', () => {
    expect(offsetCm(750, 4_500, 25)).toBe(-30);
    expect(offsetCm(4_500 - 250, 4_500, 25)).toBe(10);
    expect(offsetCm(0, 4_500, 25)).toBe(0);
  });
});

/** A bout of licks at 7 Hz with contacts of 40 ms, each onset bouncing so many times. */
function licking(bounces: number, licks = 80): Contact[] {
  return Array.from({ length: licks }, (_, n) => {
    const fromUs = n * 143_000;
    return Array.from({ length: bounces + 1 }, (_, b) => ({
      fromUs: fromUs + b * 6_000,
      lastsUs: b < bounces ? 2_000 : 40_000,
    }));
  }).flat();
}

describe('live licking', () => {
  it('gives contacts from edges, a fall without a rise left out', () => {
    const edges = [
      { atUs: 5, level: 0 },
      { atUs: 10, level: 1 },
      { atUs: 40, level: 0 },
      { atUs: 90, level: 1 },
    ] as const;
    expect(contactsOf(edges)).toEqual([{ fromUs: 10, lastsUs: 30 }]);
  });

  it('proposes a lockout between bounces and licks, and says why', () => {
    const fit = fitLicks(licking(2));
    expect(fit.bounces).toBe(160);
    // Bounces 6 ms apart; the next lick 131 ms after the last of them.
    expect(fit.lockout.us).toBeGreaterThan(6_000);
    expect(fit.lockout.us).toBeLessThan(0.8 * 131_000);
    expect(fit.lockout.because).toContain('bounces end within 6 ms');
    // Two bounces 6 ms apart and 40 ms of tongue are one contact of 52 ms.
    expect(fit.contactMs).toMatchObject({ n: 80, median: 52 });
  });

  it('without bounces proposes what is usual: 50 ms (common practice, no source)', () => {
    const fit = fitLicks(licking(0));
    expect(fit.lockout).toMatchObject({ us: 50_000 });
    expect(fit.lockout.because).toContain('no bounce was seen');
    expect(fit.lickHz).toBeCloseTo(7, 1);
    expect(fit.stuck).toMatchObject({ us: 300_000 });
  });

  it('calls a sensor bad rather than propose a lockout that swallows licks', () => {
    const slow = licking(0).flatMap(({ fromUs, lastsUs }) => [
      { fromUs, lastsUs },
      { fromUs: fromUs + 70_000, lastsUs },
    ]);
    const fit = fitLicks(slow);
    expect(fit.lockout.us).toBeLessThanOrEqual(80_000);
  });

  it('tells echoes of an output from chance', () => {
    const changes = Array.from({ length: 50 }, (_, n) => n * 200_000);
    const onsets = [...changes.slice(0, 40).map((us) => us + 1_000), 77_000];
    const rate = echoRate('valve', changes, onsets, 5_000, 10_000_000);
    expect(rate).toMatchObject({ changes: 50, echoes: 40 });
    expect(rate.byChance).toBeCloseTo(50 * (1 - Math.exp((-41 * 5_000) / 1e7)), 9);
    expect(echoRate('laser', [], onsets, 5_000, 1e7)).toMatchObject({ changes: 0, byChance: 0 });
  });
});

describe('latencies', () => {
  it('of frames are taken from the promptest of their stretch, whatever the clocks drift', () => {
    const frames = Array.from({ length: 2_000 }, (_, n) => ({
      boardUs: n * 1_000,
      hostUs: 5e9 + n * 1_000 * 1.00005 + (n === 700 ? 30_000 : 0),
    }));
    const late = latenessUs(frames);
    expect(late[700]).toBeCloseTo(30_000 + 35, 0);
    expect(Math.max(...late.filter((_, n) => n !== 700))).toBeLessThan(60);
  });

  it('are told as distributions, every value in a bin', () => {
    const fit = fitLatencies({
      roundTripUs: [90, 100, 110, 5_000],
      frameLateUs: [10, 20, 160_000],
      outputUs: [],
    });
    expect(fit.roundTripUs).toMatchObject({ n: 4, median: 105, most: 5_000 });
    expect(fit.roundTripUs.counts.reduce((a, b) => a + b, 0)).toBe(4);
    expect(fit.stalls).toBe(1);
    expect(fit.outputUs).toBeNull();
  });
});
