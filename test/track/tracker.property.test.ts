import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { dice } from './beltModel.js';
import { TrackedBelt } from './trackedBelt.js';

const SUBSTEP_US = 250;
const WINDOW_US = 200_000;
/** Fastest movement: 4 counts in 250 us. */
const MOST_IN_MS = 16;

const world = fc.record({
  seed: fc.integer(),
  lengthCm: fc.double({ min: 60, max: 200, noNaN: true }),
  countsPerCm: fc.double({ min: 8, max: 40, noNaN: true }),
  direction: fc.constantFrom<1 | -1>(1, -1),
  // Both wrap within the run in a part of the runs.
  startUs: fc.constantFrom(1000, 0x1_0000_0000 - 5_000_000, 0x8000_0000 - 3_000_000),
  startCount: fc.constantFrom(0, 0x7fff_ffff - 500, -0x8000_0000 + 500),
  bounces: fc.integer({ min: 0, max: 3 }),
  markWidth: fc.integer({ min: 12, max: 100 }),
  missChance: fc.constantFrom(0, 0.15),
  overtakenChance: fc.constantFrom(0, 0.3),
  slipChance: fc.constantFrom(0, 0.02),
  lossChance: fc.constantFrom(0, 0, 0.01),
});
type World = typeof world extends fc.Arbitrary<infer T> ? T : never;

/** One trajectory: the belt and what must hold at every instant of it. */
class Trajectory {
  readonly rig: TrackedBelt;
  readonly #world: World;
  readonly #roll: () => number;
  readonly #lap: number;
  /** Most slip between two marks, counts. */
  readonly #slipMost: number;
  /** Encoder less belt: now less this is the tracker's error. */
  #slipAtCorrection = 0;
  #slipAtMark = 0;
  #missedLast = false;
  #newMarks = 0;
  #firstTurn = 0;
  #eventsSeen = 0;
  #corrected = false;
  readonly #timesUs: number[] = [];
  readonly #counts: number[] = [];
  // What the last instant said.
  #nowUs = 0;
  #travel = 0;
  #progress = 0;
  #lapSeen = 0;
  readonly #reached = new Set<string>();

  constructor(of: World) {
    this.#world = of;
    this.#roll = dice(of.seed);
    this.#lap = Math.round(of.lengthCm * of.countsPerCm);
    this.#slipMost = Math.floor(0.4 * of.countsPerCm);
    this.rig = new TrackedBelt(
      {
        lengthCm: of.lengthCm,
        countsPerCm: of.countsPerCm,
        direction: of.direction,
        speedWindowUs: WINDOW_US,
      },
      {
        startUs: of.startUs,
        startCount: of.startCount,
        startBelt: -60,
        bounces: of.bounces,
        markWidth: of.markWidth,
        misses: () => this.#misses(),
        overtaken: () => this.#roll() < of.overtakenChance,
      },
    );
    this.rig.lose = () => this.#roll() < of.lossChance;
    this.rig.after = () => this.#check();
  }

  get #slip(): number {
    return this.rig.belt.encoder - (this.rig.belt.belt + 60);
  }

  /** Never two new marks in a row, nor the first, so that slip stays within what is believed. */
  #misses(): boolean {
    const { belt } = this.rig;
    const isNew = belt.belt === belt.furthest;
    if (!isNew) return this.#roll() < this.#world.missChance;
    this.#newMarks++;
    this.#missedLast =
      this.#newMarks > 1 && !this.#missedLast && this.#roll() < this.#world.missChance;
    if (!this.#missedLast) this.#slipAtMark = this.#slip;
    return this.#missedLast;
  }

  /** Runs, backs, trembles and rests for `us`. */
  live(us: number): void {
    const { belt } = this.rig;
    const endUs = belt.nowUs + us;
    this.#remember();
    belt.sample();
    while (belt.nowUs < endUs) {
      const mode = this.#roll();
      const untilUs = belt.nowUs + Math.floor(this.#roll() * 900_000);
      const speed = this.#roll() * 4;
      while (belt.nowUs < untilUs) {
        for (let i = 0; i < 4; i++) this.#step(mode, speed);
        belt.sampleIfDue();
      }
    }
    // To the middle of a lap, where no slip can blur which one it is.
    const inLap = belt.belt - Math.floor(belt.belt / this.#lap) * this.#lap;
    this.#remember();
    belt.run(Math.floor(this.#lap * 2.5) - inLap, 3);
  }

  #step(mode: number, speed: number): void {
    const { belt } = this.rig;
    const tremble = Math.floor(this.#roll() * 5) - 2;
    const forwards = Math.floor(speed + this.#roll());
    if (mode < 0.5) belt.move(forwards, SUBSTEP_US);
    else if (mode < 0.65) belt.move(-forwards, SUBSTEP_US);
    else if (mode < 0.85) belt.move(tremble, SUBSTEP_US);
    else belt.move(0, SUBSTEP_US);
    if (mode < 0.5 && forwards > 1 && this.#roll() < this.#world.slipChance) {
      const by = this.#roll() < 0.5 ? 1 : -1;
      const most = this.#slipMost * (this.#missedLast ? 2 : 1);
      if (Math.abs(this.#slip + by - this.#slipAtMark) <= most) belt.slip(by);
    }
    this.#remember();
  }

  #remember(): void {
    this.#timesUs.push(this.rig.belt.nowUs);
    this.#counts.push(this.rig.belt.encoder);
  }

  #check(): void {
    const { instant } = this.rig;
    this.#readEvents();
    // Compared before `expect`, which is slow: a trajectory has tens of thousands of instants.
    must(instant.nowUs >= this.#nowUs, 'time never goes back');
    must(instant.progressFrom >= this.#progress, 'progress never goes back');
    must(instant.progressTo >= instant.progressFrom, 'progress never goes back');
    must(instant.progressTo >= instant.travelTo, 'progress is the furthest travel');
    must(instant.lapBegan === (instant.lap !== this.#lapSeen), 'a new lap begins once');
    must(instant.lap === this.#lapSeen || instant.lap === this.#lapSeen + 1, 'laps follow on');
    if (!this.#corrected) must(instant.travelFrom === this.#travel, 'travel is unbroken');
    must(instant.placed === instant.lap > 0, 'placed from lap 1 on');
    this.#noteReached();
    this.#nowUs = instant.nowUs;
    this.#travel = instant.travelTo;
    this.#progress = instant.progressTo;
    this.#lapSeen = instant.lap;
    if (this.#world.lossChance > 0) return;
    this.#checkSpeed();
    if (instant.placed) this.#checkPlace();
  }

  #readEvents(): void {
    const { events } = this.rig;
    this.#corrected = false;
    for (; this.#eventsSeen < events.length; this.#eventsSeen++) {
      const event = events[this.#eventsSeen]!;
      if (event.kind !== 'seam' || event.event === 'missed') continue;
      // With edges lost, a mark may be disbelieved; it is never believed in the wrong lap.
      const disbelieved = event.event === 'ignored' && this.#world.lossChance > 0;
      const good = event.event === 'first' || event.event === 'accepted' || disbelieved;
      must(good, `no mark is ${event.event}`);
      if (event.event === 'first') this.#beginLaps();
      this.#slipAtCorrection = this.#slip;
      this.#corrected = true;
    }
  }

  /** The belt may have backed past another mark before it met its first one forwards. */
  #beginLaps(): void {
    const { belt } = this.rig;
    belt.furthest = belt.belt;
    this.#firstTurn = Math.round(belt.belt / this.#lap);
  }

  get #lapTruth(): number {
    return Math.floor(this.rig.belt.furthest / this.#lap) - this.#firstTurn + 1;
  }

  /** Every place is reached at most once a lap. */
  #noteReached(): void {
    const { progressFrom, progressTo } = this.rig.instant;
    for (let tenth = Math.floor((progressFrom / this.#lap) * 10); ; tenth++) {
      const place = (tenth * this.#lap) / 10;
      if (place > progressTo) return;
      if (place <= progressFrom) continue;
      const name = `${tenth}`;
      must(!this.#reached.has(name), 'a place is reached once a lap');
      this.#reached.add(name);
    }
  }

  #checkPlace(): void {
    const { instant, belt, tracker } = this.rig;
    const perCm = this.#lap / this.#world.lengthCm;
    const errorCounts = wrapped(instant.positionCm * perCm - belt.belt, this.#lap);
    // An overtaken edge is read up to a millisecond after it; backing meets the mark a count off.
    const sinceMark = Math.abs(this.#slip - this.#slipAtCorrection);
    must(
      Math.abs(instant.travelTo - tracker.travelAtCount(belt.count)) <= MOST_IN_MS,
      'up to date',
    );
    const behind = tracker.travelAtCount(belt.count) - instant.travelTo;
    must(Math.abs(errorCounts + behind) <= sinceMark + 2, 'position is off by the slip at most');
    must(sinceMark <= 4 * this.#slipMost, 'slip is bounded by the marks');
    const truth = belt.furthest / this.#lap;
    const toSeam = Math.abs(truth - Math.round(truth)) * this.#lap;
    const clear = toSeam > 4 * this.#slipMost + MOST_IN_MS + 2;
    if (clear) must(instant.lap === this.#lapTruth, 'laps are those of the truth');
  }

  #checkSpeed(): void {
    const { instant, belt } = this.rig;
    if (this.#timesUs.at(-1)! + 1000 < belt.nowUs) return;
    const beganUs = belt.nowUs - WINDOW_US;
    let at = this.#timesUs.length - 1;
    while (at > 0 && this.#timesUs[at]! > beganUs) at--;
    const countsPerUs = (belt.encoder - this.#counts[at]!) / WINDOW_US;
    const truth = (countsPerUs * 1_000_000 * this.#world.lengthCm) / this.#lap;
    const oneCount = (1_000_000 / WINDOW_US / this.#lap) * this.#world.lengthCm;
    must(Math.abs(instant.speedCmPerS - truth) <= (2 * MOST_IN_MS + 2) * oneCount, 'speed is true');
  }

  /** In the middle of a lap, at the end of it all. */
  checkEnd(): void {
    const { instant, laps } = this.rig;
    const lapTruth = this.#lapTruth;
    expect(instant.lap).toBe(lapTruth);
    if (this.#world.lossChance > 0) return;
    expect(laps).toEqual(Array.from({ length: lapTruth }, (_, i) => i + 1));
  }
}

function must(holds: boolean, what: string): void {
  if (!holds) throw new Error(`broken: ${what}`);
}

/** The nearest to 0 of `counts` plus any number of laps. */
function wrapped(counts: number, lap: number): number {
  return counts - Math.round(counts / lap) * lap;
}

describe('a belt that jitters, backs, crosses the seam both ways, slips, bounces and misses marks', () => {
  it('is followed: position, laps, progress and speed agree with the truth at every instant', () => {
    fc.assert(
      fc.property(world, (of) => {
        const trajectory = new Trajectory(of);
        trajectory.live(8_000_000);
        trajectory.checkEnd();
      }),
      { seed: 20_261_201, numRuns: 60 },
    );
  });
});

describe('a belt that slips once by any length', () => {
  it('is doubtful when marks disagree, and right again after three of them', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: -1700, max: 1700 }),
        fc.integer({ min: 100, max: 3500 }),
        (slip, atCounts) => {
          const rig = new TrackedBelt().begin();
          rig.belt.run(atCounts, 4);
          rig.belt.slip(slip);
          for (let lap = 0; lap < 5; lap++) {
            // Whenever position is trusted after a mark has been met, it is right.
            rig.belt.run(3600, 4);
            const error = Math.abs(wrapped(rig.instant.positionCm * 20 - rig.belt.belt, 3600));
            if (rig.instant.trust === 'trusted') expect(error).toBeLessThan(1);
            if (lap >= 3) expect(rig.instant.trust).toBe('trusted');
          }
        },
      ),
      { seed: 20_261_201, numRuns: 200 },
    );
  });
});
