import { describe, expect, it } from 'vitest';
import { LAP, TrackedBelt } from './trackedBelt.js';

describe('the first seam mark', () => {
  it('begins lap 1 at 0 cm, and position is unknown before it', () => {
    const rig = new TrackedBelt();
    rig.belt.sample();
    rig.belt.run(99, 3);
    expect(rig.instant.placed).toBe(false);
    expect(rig.instant.positionCm).toBeNaN();
    expect(rig.instant.trust).toBe('unknown');
    expect(rig.instant.lap).toBe(0);
    rig.belt.run(1);
    expect(rig.instant.placed).toBe(true);
    expect(rig.instant.positionCm).toBe(0);
    expect(rig.instant.trust).toBe('trusted');
    expect(rig.instant.lap).toBe(1);
    expect(rig.seams).toEqual(['first']);
    expect(rig.laps).toEqual([1]);
  });

  it('shows movement that reaches 0 cm and nothing before it', () => {
    const rig = new TrackedBelt();
    const seen: string[] = [];
    rig.after = () => {
      const { lapBegan, progressFrom, progressTo } = rig.instant;
      if (lapBegan) seen.push(`${progressFrom} to ${progressTo}`);
    };
    rig.begin();
    expect(seen).toEqual([`${LAP - 1} to ${LAP}`]);
  });

  it('does not count when the belt backs over it', () => {
    const rig = new TrackedBelt({}, { startBelt: 100 });
    rig.belt.sample();
    rig.belt.run(-200, 3);
    expect(rig.instant.placed).toBe(false);
    rig.belt.run(300, 3);
    expect(rig.instant.positionCm).toBe(10);
    expect(rig.laps).toEqual([1]);
  });

  it('is found although a sample overtook it', () => {
    const rig = new TrackedBelt({}, { overtaken: () => true });
    rig.belt.sample();
    rig.belt.run(120, 7);
    expect(rig.instant.positionCm).toBe(1);
    expect(rig.tracker.stampUs).toBeLessThanOrEqual(rig.tracker.nowUs);
  });
});

describe('the offset from sensor to animal', () => {
  it('places the animal beyond the seam when the seam has gone by already', () => {
    const rig = new TrackedBelt({ seam: { input: 1, offsetCm: 7 } }).begin();
    expect(rig.instant.positionCm).toBe(7);
    expect(rig.instant.lap).toBe(1);
    rig.belt.run(LAP, 4);
    expect(rig.instant.positionCm).toBe(7);
    expect(rig.laps).toEqual([1, 2]);
  });

  it('lets lap 1 begin only at the seam when the seam is still to come', () => {
    const rig = new TrackedBelt({ seam: { input: 1, offsetCm: -7 } }).begin(6.9);
    expect(rig.instant.placed).toBe(false);
    expect(rig.instant.lap).toBe(0);
    expect(rig.instant.trust).toBe('trusted');
    let from = 0;
    rig.after = () => {
      if (rig.instant.lapBegan) from = rig.instant.progressFrom;
    };
    rig.belt.run(4, 4);
    expect(rig.instant.lap).toBe(1);
    expect(rig.instant.positionCm).toBeCloseTo(0.1, 9);
    expect(from).toBe(LAP - 1);
    rig.belt.run(LAP, 4);
    expect(rig.instant.positionCm).toBeCloseTo(0.1, 9);
    expect(rig.laps).toEqual([1, 2]);
  });
});

describe('laps', () => {
  it('are not added by backing over the seam and coming forward again', () => {
    const rig = new TrackedBelt().begin(5);
    for (let i = 0; i < 5; i++) {
      rig.belt.run(-300, 3);
      expect(rig.instant.lap).toBe(1);
      expect(rig.instant.positionCm).toBeCloseTo(170, 6);
      rig.belt.run(300, 3);
    }
    expect(rig.instant.positionCm).toBe(5);
    expect(rig.laps).toEqual([1]);
    expect(rig.seams).toEqual(['first']);
    rig.belt.run(LAP, 3);
    expect(rig.laps).toEqual([1, 2]);
  });

  it('are counted the same when counts fall as the animal runs', () => {
    const rig = new TrackedBelt({ direction: -1 }, { startCount: 70 }).begin(10);
    rig.belt.run(3 * LAP, 4);
    rig.belt.run(-100, 2);
    rig.belt.rest(160_000);
    expect(rig.laps).toEqual([1, 2, 3, 4]);
    expect(rig.instant.positionCm).toBe(5);
    expect(rig.instant.speedCmPerS).toBeLessThan(0);
  });
});

describe('slip', () => {
  it('is taken back at the mark and told', () => {
    const rig = new TrackedBelt().begin(50);
    rig.belt.slip(-6);
    expect(rig.instant.positionCm).toBe(50);
    rig.belt.run(LAP - 1000, 4);
    expect(rig.instant.positionCm).toBe(0);
    expect(rig.seams).toEqual(['first', 'accepted -3']);
    expect(rig.instant.trust).toBe('trusted');
  });

  it('between 1 and 3 cm is corrected, and trust that was lost stays lost', () => {
    let pass = 0;
    const rig = new TrackedBelt({}, { misses: () => pass++ === 1 }).begin(50);
    rig.belt.run(LAP, 4);
    expect(rig.instant.trust).toBe('doubtful');
    rig.belt.slip(40);
    rig.belt.run(LAP, 4);
    expect(rig.seams).toEqual(['first', 'missed', 'accepted 20']);
    expect(rig.instant.positionCm).toBe(50);
    expect(rig.instant.trust).toBe('doubtful');
    rig.belt.run(LAP, 4);
    expect(rig.instant.trust).toBe('trusted');
  });

  it('forwards makes places jumped over missed: progress never shows them', () => {
    const rig = new TrackedBelt().begin(50);
    rig.belt.slip(-20);
    rig.belt.run(LAP - 1001, 1);
    let shown = 0;
    rig.after = () => {
      shown += rig.instant.progressTo - rig.instant.progressFrom;
    };
    expect(rig.tracker.positionCmOf(rig.instant.travelTo)).toBeCloseTo(178.95, 6);
    rig.belt.run(101, 1);
    expect(rig.instant.positionCm).toBe(5);
    // 100 counts beyond the seam, and the one on which the mark was met.
    expect(shown).toBe(101);
    expect(rig.instant.lap).toBe(2);
  });

  it('backwards makes nothing come up twice: progress waits until travel is past it', () => {
    const rig = new TrackedBelt().begin(50);
    rig.belt.slip(20);
    rig.belt.run(LAP - 1000, 1);
    expect(rig.instant.positionCm).toBe(0);
    expect(rig.instant.travelTo).toBe(2 * LAP);
    const reached: number[] = [];
    rig.after = () => {
      if (rig.instant.progressTo > rig.instant.progressFrom) reached.push(rig.instant.progressTo);
    };
    rig.belt.run(30, 1);
    expect(reached[0]).toBe(2 * LAP + 21);
    expect(rig.laps).toEqual([1, 2]);
  });
});

describe('a mark far from where it should be', () => {
  it('is ignored, told once, and makes position doubtful until a good mark', () => {
    const rig = new TrackedBelt({}, { bounces: 3 }).begin(60);
    // A second strip: dirt that the sensor takes for the mark.
    for (let i = 0; i < 3; i++) {
      rig.belt.edge(1, 1);
      rig.belt.run(4);
      rig.belt.edge(1, 0);
      rig.belt.run(1);
    }
    expect(rig.seams).toEqual(['first', 'ignored 600']);
    expect(rig.instant.trust).toBe('doubtful');
    expect(rig.tracker.trustReason).toContain('600 mm');
    expect(rig.instant.positionCm).toBeCloseTo(60.75, 6);
    rig.belt.run(LAP, 4);
    expect(rig.instant.trust).toBe('trusted');
    expect(rig.instant.positionCm).toBeCloseTo(60.75, 6);
  });

  it('that comes at the same false place every lap never moves position', () => {
    const rig = new TrackedBelt().begin(60);
    for (let lap = 0; lap < 5; lap++) {
      rig.belt.edge(1, 1);
      rig.belt.edge(1, 0);
      rig.belt.run(LAP, 4);
    }
    expect(rig.seams.filter((seam) => seam.startsWith('rehomed'))).toEqual([]);
    expect(rig.instant.positionCm).toBe(60);
    expect(rig.laps).toEqual([1, 2, 3, 4, 5, 6]);
  });

  it('moves nothing when the next one disagrees with it too', () => {
    let pass = 0;
    const rig = new TrackedBelt({}, { misses: () => pass++ === 1 }).begin(60);
    rig.belt.edge(1, 1);
    rig.belt.run(20, 4);
    rig.belt.edge(1, 0);
    rig.belt.run(LAP + 780, 4);
    rig.belt.edge(1, 1);
    expect(rig.seams).toEqual(['first', 'ignored 600', 'missed', 'ignored -800']);
    expect(rig.instant.positionCm).toBe(100);
  });

  it('moves position when the next one agrees, and is trusted after a third', () => {
    const rig = new TrackedBelt().begin(30);
    rig.belt.slip(800);
    rig.belt.run(LAP, 4);
    expect(rig.seams).toEqual(['first', 'missed', 'ignored 400']);
    expect(rig.instant.trust).toBe('doubtful');
    rig.belt.run(LAP, 4);
    expect(rig.seams.slice(3)).toEqual(['missed', 'rehomed 400']);
    expect(rig.instant.positionCm).toBe(30);
    expect(rig.instant.trust).toBe('doubtful');
    rig.belt.run(LAP, 4);
    expect(rig.instant.trust).toBe('trusted');
    expect(rig.instant.positionCm).toBe(30);
  });
});

describe('a missed mark', () => {
  it('is told once the belt is 3 cm past it, forwards', () => {
    let pass = 0;
    const rig = new TrackedBelt({}, { misses: () => pass++ === 1 }).begin(0);
    rig.belt.run(LAP + 60, 1);
    expect(rig.seams).toEqual(['first']);
    rig.belt.run(1);
    expect(rig.seams).toEqual(['first', 'missed']);
    expect(rig.instant.trust).toBe('doubtful');
    expect(rig.laps).toEqual([1, 2]);
    rig.belt.run(LAP, 4);
    expect(rig.instant.trust).toBe('trusted');
    expect(rig.laps).toEqual([1, 2, 3]);
  });

  it('is told backwards too', () => {
    let pass = 0;
    const rig = new TrackedBelt({}, { misses: () => pass++ === 1 }).begin(10);
    rig.belt.run(-270, 2);
    expect(rig.seams).toEqual(['first', 'missed']);
    expect(rig.instant.trust).toBe('doubtful');
    // Met where expected on the way forwards: position was right all along.
    rig.belt.run(100, 2);
    expect(rig.instant.trust).toBe('trusted');
    expect(rig.instant.positionCm).toBeCloseTo(1.5, 6);
    expect(rig.laps).toEqual([1]);
  });
});

describe('a bouncing sensor', () => {
  it('makes one mark of many edges, at the leading and at the trailing edge', () => {
    const rig = new TrackedBelt({}, { bounces: 5, markWidth: 50 }).begin(20);
    rig.belt.run(LAP, 4);
    rig.belt.slip(10);
    rig.belt.run(LAP, 4);
    expect(rig.seams).toEqual(['first', 'accepted 0', 'accepted 5']);
    expect(rig.instant.positionCm).toBe(20);
    expect(rig.laps).toEqual([1, 2, 3]);
  });

  it('is met at the same physical edge when the belt backs, whatever the width of the mark', () => {
    const rig = new TrackedBelt({}, { bounces: 2, markWidth: 200 }).begin(20);
    rig.belt.slip(30);
    rig.belt.run(-500, 4);
    // 15 mm of slip, less the count that lies between the edge met forwards and backwards.
    expect(rig.seams).toEqual(['first', 'accepted 14.5']);
    expect(Math.abs(rig.instant.positionCm - 175)).toBeLessThanOrEqual(0.05 + 1e-9);
  });
});

describe('dirt near the mark', () => {
  it('just behind it is no second mark', () => {
    const rig = new TrackedBelt().begin(2);
    rig.belt.edge(1, 1);
    rig.belt.run(10, 2);
    rig.belt.edge(1, 0);
    expect(rig.seams).toEqual(['first']);
    expect(rig.instant.positionCm).toBe(2.5);
    expect(rig.instant.trust).toBe('trusted');
  });

  it('in several spots of one place is told once', () => {
    const rig = new TrackedBelt().begin(60);
    for (let spot = 0; spot < 3; spot++) {
      rig.belt.edge(1, 1);
      rig.belt.run(8, 2);
      rig.belt.edge(1, 0);
      rig.belt.run(8, 2);
    }
    expect(rig.seams).toEqual(['first', 'ignored 600']);
  });

  it('is not taken for the mark when the frame before was lost', () => {
    const rig = new TrackedBelt({}, { bounces: 1, markWidth: 100 }).begin(-1);
    // Of the trailing edge's fall, rise and fall the first never comes.
    let falls = 0;
    rig.lose = (kind, message) =>
      kind === 'edge' && 'level' in message && message.level === 0 && ++falls === 2;
    rig.belt.run(200, 4);
    expect(falls).toBeGreaterThan(2);
    expect(rig.seams).toEqual(['first']);
    expect(rig.instant.positionCm).toBe(9);
  });
});

describe('a rig without a seam mark', () => {
  it('begins lap 1 at once, is trusted from the start and counts laps by counts', () => {
    const rig = new TrackedBelt({ seam: null }, { startBelt: 0, startCount: 12_345 });
    rig.belt.sample();
    expect(rig.instant.placed).toBe(true);
    expect(rig.instant.lap).toBe(1);
    expect(rig.instant.lapBegan).toBe(true);
    expect(rig.instant.positionCm).toBe(0);
    expect(rig.instant.trust).toBe('trusted');
    rig.belt.run(2 * LAP + 200, 4);
    expect(rig.laps).toEqual([1, 2, 3]);
    expect(rig.instant.positionCm).toBe(10);
    expect(rig.seams).toEqual([]);
  });

  it('must have its start declared again after the board restarted', () => {
    const rig = new TrackedBelt({ seam: null }, { startBelt: 0 });
    rig.belt.sample();
    rig.belt.run(200, 4);
    rig.tracker.linkResumed(false);
    rig.belt.run(200, 4);
    expect(rig.instant.trust).toBe('unknown');
    expect(rig.instant.positionCm).toBeNaN();
    rig.tracker.declareStart();
    rig.belt.run(20, 4);
    expect(rig.instant.trust).toBe('trusted');
    expect(rig.instant.lap).toBe(2);
    expect(rig.instant.positionCm).toBe(1);
  });
});
