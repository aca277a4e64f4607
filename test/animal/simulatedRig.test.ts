import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import type { BoardOutput } from '../../hardware-sim/board/boardOutput.js';
import { SimulatedRig, type SimulatedRigOptions } from '../../hardware-sim/simulatedRig.js';
import { blank } from '../../server/wire/codec.js';
import {
  type Edge,
  OUTCOME,
  type Outcome,
  PROTOCOL_VERSION,
  PULSE_FLAG,
  type Sample,
} from '../../server/wire/messages.js';

const TAG = 9;
const NO_SLIP = { slipPerLapCm: 0, slipSpreadCm: 0 };

interface Heard {
  samples: (Sample & { trueCm: number })[];
  edges: (Edge & { trueCm: number })[];
  outcomes: (Outcome & { trueCm: number })[];
}

function rigWith(options: SimulatedRigOptions): { rig: SimulatedRig; heard: Heard } {
  const heard: Heard = { samples: [], edges: [], outcomes: [] };
  const none = () => {};
  const output: BoardOutput = {
    identity: none,
    sample: (message) => heard.samples.push({ ...message, trueCm: rig.belt.travelCm }),
    edge: (message) => heard.edges.push({ ...message, trueCm: rig.belt.travelCm }),
    outcome: (message) => heard.outcomes.push({ ...message, trueCm: rig.belt.travelCm }),
    fault: none,
    clock: none,
  };
  const rig: SimulatedRig = new SimulatedRig(options, output);
  const { board } = rig;
  board.receive('identify', { nonce: 1, protocol: PROTOCOL_VERSION, newTag: TAG }, 0);
  beat(rig);
  const limits = { longestOnUs: 1_000_000, leastGapUs: 0, allowanceUs: 4e9, leastCounts: 0 };
  for (const output of [0, 1]) {
    board.receive('configure', { output, flags: 0, allowanceRises: 65_535, ...limits }, TAG);
  }
  return { rig, heard };
}

function beat(rig: SimulatedRig): void {
  rig.board.receive('beat', { finishedUs: rig.board.boardUs, wanted: 0xffff_ffff }, TAG);
}

/** Drives the belt at one speed after another, each for so long. */
function drive(rig: SimulatedRig, legs: readonly { cmPerS: number; ms: number }[]): void {
  for (const { cmPerS, ms } of legs) {
    rig.forcedCmPerS = cmPerS;
    rig.advanceTo(rig.nowUs + ms * 1000);
  }
}

const seamEdges = (heard: Heard) => heard.edges.filter((edge) => edge.input === 1);

describe('the simulated belt', () => {
  test('turns the encoder by the counts that the rig has per cm', () => {
    const { rig } = rigWith({ startCm: 0, belt: { ...NO_SLIP, countsPerCm: 37.5 } });
    drive(rig, [{ cmPerS: 40, ms: 60_000 }]);
    expect(rig.belt.travelCm).toBeCloseTo(40 * 59.999, 6);
    expect(rig.board.count).toBe(Math.floor(rig.belt.travelCm * 37.5 + 0.5));
  });

  test('shows the mark over its width on every lap, at the true place and time', () => {
    const { rig, heard } = rigWith({ startCm: 100, belt: { ...NO_SLIP, markCm: 20 } });
    drive(rig, [{ cmPerS: 50, ms: 20_000 }]);
    const edges = seamEdges(heard);
    expect(edges.length).toBeGreaterThanOrEqual(10);
    edges.forEach((edge, n) => {
      const lap = 1 + Math.floor(n / 2);
      const edgeCm = lap * 180 + 20 + (n % 2);
      expect(edge.level).toBe(n % 2 === 0 ? 1 : 0);
      expect(Math.abs(edge.trueCm - edgeCm)).toBeLessThan(0.0002);
      // The belt stands still in the first millisecond.
      expect(Math.abs(edge.boardUs - (1000 + ((edgeCm - 100) / 50) * 1e6))).toBeLessThanOrEqual(2);
      expect(edge.count).toBe(Math.floor((edge.trueCm - 100) * 20 + 0.5));
    });
  });

  test('shows the same stretch of belt from whichever side it comes', () => {
    fc.assert(
      fc.property(
        fc.array(
          fc.record({
            cmPerS: fc.integer({ min: -60, max: 60 }),
            ms: fc.integer({ min: 1, max: 3000 }),
          }),
          { minLength: 1, maxLength: 40 },
        ),
        (legs) => {
          const { rig, heard } = rigWith({ startCm: 178, belt: NO_SLIP });
          drive(rig, legs);
          const edges = seamEdges(heard);
          const nearestCm = (cm: number) => Math.abs(cm - 180 * Math.round(cm / 180));
          edges.forEach((edge, n) => {
            expect(edge.level).toBe(n % 2 === 0 ? 1 : 0);
            const off = Math.min(nearestCm(edge.trueCm), nearestCm(edge.trueCm - 1));
            expect(off).toBeLessThan(0.001);
          });
          const { positionCm } = rig.belt;
          const clear = Math.min(nearestCm(positionCm), nearestCm(positionCm - 1)) > 0.001;
          if (clear) expect(edges.length % 2 === 1).toBe(positionCm < 1);
        },
      ),
      { seed: 91, numRuns: 40 },
    );
  });

  test('misses a mark whole or not at all', () => {
    const { rig, heard } = rigWith({ startCm: 100, belt: { ...NO_SLIP, markMissChance: 0.5 } });
    drive(rig, [{ cmPerS: 100, ms: 180_000 }]);
    const edges = seamEdges(heard);
    expect(edges.length / 2).toBeGreaterThan(30);
    expect(edges.length / 2).toBeLessThan(70);
    edges.forEach((edge, n) => {
      expect(edge.level).toBe(n % 2 === 0 ? 1 : 0);
    });
  });

  test('leaves no bounce behind of a mark that it missed', () => {
    const belt = { ...NO_SLIP, markMissChance: 1, markBounces: 2 };
    const { rig, heard } = rigWith({ startCm: 100, belt });
    drive(rig, [{ cmPerS: 100, ms: 20_000 }]);
    expect(seamEdges(heard)).toEqual([]);
  });

  test('bounces at the mark when told to, and comes to rest at the right level', () => {
    const { rig, heard } = rigWith({ startCm: 170, belt: { ...NO_SLIP, markBounces: 3 } });
    drive(rig, [{ cmPerS: 20, ms: 2000 }]);
    const edges = seamEdges(heard);
    expect(edges.map((edge) => edge.level)).toEqual([1, 0, 1, 0, 1, 0, 1, 0, 1, 0, 1, 0, 1, 0]);
    const gaps = edges.slice(1).map((edge, n) => edge.boardUs - edges[n]!.boardUs);
    expect(gaps.filter((us) => us > 800)).toHaveLength(1);
  });

  test('slips by as much a lap as it says: the encoder reads more than the belt has moved', () => {
    const belt = { slipPerLapCm: 0.3, slipSpreadCm: 0 };
    const { rig } = rigWith({ startCm: 0, belt });
    drive(rig, [{ cmPerS: 90, ms: 20_050 }]);
    expect(rig.belt.lap).toBe(10);
    expect(rig.board.count / 20 - rig.belt.travelCm).toBeCloseTo(3, 1);
  });

  test('has a slip of one moment when a test asks for it, which fires what it passes', () => {
    const { rig, heard } = rigWith({ startCm: 0, belt: NO_SLIP });
    rig.board.receive(
      'arm',
      { ...blank('arm'), id: 1, output: 1, rising: 1, count: 40, widthUs: 1000, repeats: 1 },
      TAG,
    );
    rig.slip(3);
    expect(rig.board.count).toBe(60);
    expect(heard.outcomes).toMatchObject([{ id: 1, kind: OUTCOME.fired, count: 40, trueCm: 0 }]);
  });
});

describe('the simulated rig', () => {
  test.each([1, -1])('fires a slot in the microsecond of its count, direction %i', (direction) => {
    const { rig, heard } = rigWith({ startCm: 90, belt: { ...NO_SLIP, mark: false } });
    const arm = { ...blank('arm'), id: 1, output: 1, widthUs: 1000, repeats: 1 };
    const count = direction * 333;
    rig.board.receive('arm', { ...arm, rising: direction > 0 ? 1 : 0, count }, TAG);
    for (let n = 0; n < 100; n++) {
      drive(rig, [{ cmPerS: direction * 17.3, ms: 20 }]);
      beat(rig);
    }
    const fired = heard.outcomes.find((outcome) => outcome.kind === OUTCOME.fired)!;
    // The encoder starts half a count up; it comes to 333 from below, and to -333 from above.
    const cm = 332.5 / 20;
    expect(Math.abs(fired.boardUs - (1000 + (cm / 17.3) * 1e6))).toBeLessThanOrEqual(2);
    expect(fired.count).toBe(count);
  });

  test('fires on the count, and counts as a plain comparison would, on any walk', () => {
    fc.assert(
      fc.property(
        fc.array(
          fc.record({
            cmPerS: fc.integer({ min: -60, max: 60 }),
            ms: fc.integer({ min: 1, max: 60 }),
            ahead: fc.integer({ min: -40, max: 40 }).filter((ahead) => ahead !== 0),
          }),
          { minLength: 1, maxLength: 40 },
        ),
        (legs) => {
          const { rig, heard } = rigWith({ startCm: 90, belt: NO_SLIP });
          const targets = new Map<number, number>();
          legs.forEach(({ cmPerS, ms, ahead }, n) => {
            const count = rig.board.count + ahead;
            targets.set(n + 1, count);
            const arm = { ...blank('arm'), id: n + 1, output: 1, widthUs: 10, repeats: 1, count };
            rig.board.receive('arm', { ...arm, slot: n % 16, rising: ahead > 0 ? 1 : 0 }, TAG);
            drive(rig, [{ cmPerS, ms }]);
            beat(rig);
            expect(rig.board.count).toBe(Math.floor(rig.belt.encoder));
          });
          for (const outcome of heard.outcomes) {
            if (outcome.kind !== OUTCOME.fired) continue;
            expect(outcome.count).toBe(targets.get(outcome.id));
            // From below a count begins at its lower edge, from above at its upper one.
            const upper = legs[outcome.id - 1]!.ahead > 0 ? 0 : 1;
            const encoder = (outcome.trueCm - 90) * 20 + 0.5;
            const off = Math.abs(encoder - outcome.count - upper);
            expect(off).toBeLessThan(0.01);
          }
        },
      ),
      { seed: 92, numRuns: 100 },
    );
  });

  test('shows the count of its own microsecond when a waiting pulse rises', () => {
    const { rig, heard } = rigWith({ startCm: 90, belt: NO_SLIP });
    const pulse = { ...blank('pulse'), id: 1, output: 1, flags: PULSE_FLAG.startAt, repeats: 1 };
    const when = { widthUs: 500, startUs: 100_357, expiryUs: 200_000 };
    rig.board.receive('pulse', { ...pulse, ...when }, TAG);
    drive(rig, [{ cmPerS: 60, ms: 150 }]);
    const travelled = (100_357 - 1000) * 60e-6;
    expect(heard.outcomes[0]!.boardUs).toBe(100_357);
    expect(heard.outcomes[0]!.count).toBe(Math.floor(travelled * 20 + 0.5));
  });

  test('gives the same frames in steps of any size', () => {
    const run = (stepUs: number) => {
      const { rig, heard } = rigWith({ seed: 12, trained: true });
      for (let us = stepUs; us <= 30e6; us += stepUs) rig.advanceTo(us);
      rig.advanceTo(30e6);
      return heard.samples.map((sample) => [sample.boardUs, sample.count, sample.inputs]);
    };
    const whole = run(30e6);
    expect(run(1000)).toEqual(whole);
    expect(run(7_000_000)).toEqual(whole);
    expect(whole.length).toBeGreaterThan(5000);
  });

  test('is no further from the truth for being paced unevenly within milliseconds', () => {
    const { rig, heard } = rigWith({ seed: 12, trained: true, belt: NO_SLIP, startCm: 0 });
    for (let us = 0; us <= 10e6; us += 337) rig.advanceTo(us);
    for (const sample of heard.samples) {
      expect(sample.count).toBe(Math.floor(sample.trueCm * 20 + 0.5));
    }
  });

  test('lets the animal drink what its valve gave, and only the wired output is a valve', () => {
    const { rig } = rigWith({ wiring: { valveOutput: 1 }, animal: { sipUl: 100 } });
    const pulse = { ...blank('pulse'), repeats: 1, expiryUs: 50_000 };
    rig.board.receive('pulse', { ...pulse, id: 1, output: 0, widthUs: 45_000 }, TAG);
    rig.board.receive('pulse', { ...pulse, id: 2, output: 1, widthUs: 5000 + 8000 * 3 }, TAG);
    rig.advanceTo(50_000);
    expect(rig.animal.drunkUl + rig.animal.atSpoutUl).toBeCloseTo(3, 9);
    rig.advanceTo(5_000_000);
    expect(rig.animal.drunkUl).toBeCloseTo(3, 9);
  });

  test('bounces at a lick when told to', () => {
    const { rig, heard } = rigWith({ lickBounces: 2, seed: 3, animal: { groomChance: 0 } });
    rig.animal.licking.begin(10_000, 5);
    rig.advanceTo(2_000_000);
    const licks = heard.edges.filter((edge) => edge.input === 0);
    expect(licks.length).toBeGreaterThanOrEqual(30);
    expect(licks.length % 6).toBe(0);
    licks.forEach((edge, n) => {
      expect(edge.level).toBe(n % 2 === 0 ? 1 : 0);
    });
  });
});
