import { describe, expect, it } from 'vitest';
import { blank } from '../../server/wire/codec.js';
import { LAP, TrackedBelt } from './trackedBelt.js';

const MIN_US = 60_000_000;
const WRAP_US = 0x1_0000_0000;

describe('board time', () => {
  it('goes on through the wrap of its 32 bits', () => {
    const rig = new TrackedBelt({}, { startUs: WRAP_US - 5000 });
    rig.belt.sample();
    const beganUs = rig.instant.nowUs;
    rig.belt.rest(20_000);
    expect(rig.instant.nowUs - beganUs).toBe(20_000);
  });

  it('keeps an edge that a sample overtook at its own stamp, and does not go back for it', () => {
    const rig = new TrackedBelt();
    rig.belt.nowUs = 10_000;
    rig.belt.sample();
    rig.tracker.edge({ boardUs: 9_400, count: rig.belt.count, input: 3, level: 1 }, rig.instant);
    expect(rig.instant.nowUs).toBe(10_000);
    expect(rig.tracker.stampUs).toBe(9_400);
  });

  for (const minutes of [40, 80]) {
    it(`is right after the host was suspended for ${minutes} min, and never ran back`, () => {
      const rig = new TrackedBelt().begin(20);
      const beganUs = rig.instant.nowUs;
      let lastUs = beganUs;
      let reached = 0;
      rig.after = () => {
        expect(rig.instant.nowUs).toBeGreaterThanOrEqual(lastUs);
        lastUs = rig.instant.nowUs;
        reached += rig.instant.progressTo - rig.instant.progressFrom;
      };
      // The belt went on by half a lap meanwhile, and nobody saw it.
      rig.lose = () => true;
      rig.belt.move(LAP / 2, minutes * MIN_US);
      rig.lose = () => false;
      rig.belt.rest(3000);
      const boardUs = rig.belt.nowUs;
      rig.tracker.clock({ boardUs: boardUs >>> 0, wraps: Math.floor(boardUs / WRAP_US) });
      rig.belt.rest(10_000);
      rig.belt.sample();
      expect(rig.instant.nowUs).toBe(beganUs + minutes * MIN_US + 13_000);
      expect(reached).toBe(0);
      expect(rig.instant.positionCm).toBe(110);
    });
  }

  it('goes on from where it was when the board restarts, and leads back to the new clock', () => {
    const rig = new TrackedBelt({}, { startUs: 50 * MIN_US }).begin();
    const beforeUs = rig.instant.nowUs;
    rig.tracker.linkResumed(false);
    rig.tracker.clock({ ...blank('identity'), boardUs: 2000, wraps: 0 });
    expect(rig.tracker.nowUs).toBe(beforeUs);
    rig.belt.nowUs = 7000;
    rig.belt.sample();
    expect(rig.instant.nowUs).toBe(beforeUs + 5000);
    expect(rig.tracker.toBoardUs(rig.instant.nowUs + 50_000)).toBe(57_000);
  });
});

describe('a link that comes back', () => {
  it('to the same boot: laps go on, and places passed meanwhile are missed', () => {
    const rig = new TrackedBelt().begin(170);
    rig.lose = () => true;
    rig.belt.run(2 * LAP, 4);
    rig.lose = () => false;
    rig.tracker.linkResumed(true);
    rig.belt.sample();
    expect(rig.instant.lap).toBe(3);
    expect(rig.instant.lapBegan).toBe(true);
    expect(rig.instant.positionCm).toBe(170);
    expect(rig.instant.progressFrom).toBe(rig.instant.progressTo);
    expect(rig.events.filter((event) => event.kind === 'unseen')).toHaveLength(1);
  });

  it('is doubtful until the next mark when a mark went by unseen', () => {
    const rig = new TrackedBelt().begin(170);
    rig.lose = () => true;
    rig.belt.run(400, 4);
    rig.lose = () => false;
    rig.tracker.linkResumed(true);
    rig.belt.sample();
    expect(rig.instant.trust).toBe('doubtful');
    expect(rig.seams).toEqual(['first']);
    rig.belt.run(LAP, 4);
    expect(rig.instant.trust).toBe('trusted');
    expect(rig.laps).toEqual([1, 2, 3]);
  });

  it('is as trusted as before when no mark went by', () => {
    const rig = new TrackedBelt().begin(20);
    rig.lose = () => true;
    rig.belt.run(400, 4);
    rig.lose = () => false;
    rig.tracker.linkResumed(true);
    rig.belt.sample();
    expect(rig.instant.trust).toBe('trusted');
    expect(rig.instant.positionCm).toBe(40);
  });

  it('to another boot: position is unknown until a mark, which begins the next lap', () => {
    const rig = new TrackedBelt().begin(100);
    rig.belt.run(LAP, 4);
    rig.tracker.linkResumed(false);
    rig.tracker.clock({ ...blank('identity'), boardUs: 0 });
    rig.belt.encoder = 0;
    rig.belt.nowUs = 1000;
    rig.belt.run(40, 4);
    expect(rig.instant.placed).toBe(false);
    expect(rig.instant.trust).toBe('unknown');
    expect(rig.tracker.trustReason).toContain('restarted');
    expect(rig.tracker.travelAtCount(rig.belt.count)).toBeNaN();
    expect(() => rig.tracker.boardCountAt(LAP)).toThrow(RangeError);
    rig.belt.run(LAP, 4);
    expect(rig.instant.trust).toBe('trusted');
    expect(rig.instant.positionCm).toBe(102);
    expect(rig.laps).toEqual([1, 2, 3]);
  });
});

describe('counts on the board', () => {
  it('stand for places whichever way counts run, through the wrap of their 32 bits', () => {
    for (const direction of [1, -1] as const) {
      for (const startCount of [0, 0x7fff_ff00, -0x7fff_ff00]) {
        const rig = new TrackedBelt({ direction }, { startCount }).begin();
        const target = rig.tracker.travelOf(rig.instant.lap, 45.013);
        const count = rig.tracker.boardCountAt(target);
        expect(count).toBe(count | 0);
        expect(rig.tracker.countRises(true)).toBe(direction === 1);
        // The count is the first one at which the animal has come to the place.
        while (rig.belt.count !== count) rig.belt.run(1);
        expect(rig.instant.travelTo).toBeGreaterThanOrEqual(target);
        expect(rig.instant.travelTo).toBeLessThan(target + 1);
        expect(rig.tracker.travelAtCount(count)).toBe(rig.instant.travelTo);
        const backwards = rig.tracker.boardCountAt(target, false);
        rig.belt.run(-1);
        expect(rig.belt.count).toBe(backwards);
      }
    }
  });

  it('give the place along the belt for any travel', () => {
    const { tracker } = new TrackedBelt().begin();
    for (const [lap, placeCm] of [
      [1, 0],
      [3, 45],
      [2, 179.95],
    ] as const) {
      const travel = Math.round(tracker.travelOf(lap, placeCm));
      expect(tracker.positionCmOf(travel)).toBeCloseTo(placeCm, 9);
    }
  });

  it('need a lap of at least 16', () => {
    expect(() => new TrackedBelt({ countsPerCm: 0.01 })).toThrow(RangeError);
    expect(() => new TrackedBelt({ countsPerCm: Number.NaN })).toThrow(RangeError);
  });
});
