import { History } from './history.js';

/** What a tally must remember, from the scopes that the rules file reads. */
export interface TallySpec {
  /** What is added up. */
  readonly of:
    | 'licks'
    | 'waiting licks'
    | 'water'
    | 'laps'
    | 'distance'
    | 'duration'
    | 'real firings'
    | 'sham firings';
  /** The span it is confined to, or -1; for firings, the rule. */
  readonly subject: number;
  /** The span whose visits it is read over, or -1. */
  readonly visitOf: number;
  /** The most laps and the longest time that are looked back over. */
  laps: number;
  windowUs: number;
}

/**
 * A running total with what it was when the lap, the phase, the cell and the visit began: every
 * scope is one subtraction.
 */
export class Tally {
  total = 0;
  private atLap = 0;
  private atPhase = 0;
  private atCell = 0;
  private atVisit = 0;
  /** Totals at the last lap beginnings, by lap ordinal; empty when no scope counts laps. */
  private readonly lapTotals: Float64Array;
  private readonly history: History | undefined;

  constructor(spec: TallySpec, startUs: number) {
    this.lapTotals = new Float64Array(spec.laps > 0 ? spec.laps + 1 : 0);
    if (spec.windowUs > 0) {
      // Only distance and time get an entry every frame; 65,536 of them are resolution enough.
      const perFrame = spec.of === 'distance' || spec.of === 'duration';
      const leastGapUs = perFrame ? Math.floor(spec.windowUs / 65_536) : 0;
      this.history = new History(spec.windowUs, leastGapUs);
      this.history.push(startUs, 0);
    }
  }

  add(amount: number, nowUs: number): void {
    this.total += amount;
    this.history?.push(nowUs, this.total);
  }

  lapBegan(ordinal: number): void {
    this.atLap = this.total;
    const size = this.lapTotals.length;
    if (size > 0) this.lapTotals[ordinal % size] = this.total;
  }
  phaseBegan(): void {
    this.atPhase = this.total;
  }
  cellBegan(): void {
    this.atCell = this.total;
  }
  visitBegan(): void {
    this.atVisit = this.total;
  }

  thisLap(): number {
    return this.total - this.atLap;
  }
  thisPhase(): number {
    return this.total - this.atPhase;
  }
  thisCell(): number {
    return this.total - this.atCell;
  }
  thisVisit(): number {
    return this.total - this.atVisit;
  }
  /** Over the `count` whole laps before the one with this ordinal; the caller knows they exist. */
  overLaps(count: number, ordinal: number): number {
    const size = this.lapTotals.length;
    return this.lapTotals[ordinal % size]! - this.lapTotals[(ordinal - count) % size]!;
  }
  /** Over the time since then, that time itself left out. */
  since(timeUs: number): number {
    return this.total - this.history!.at(timeUs);
  }

  /** Takes one unit out again that was added then, so that no scope sees it any more. */
  withdraw(at: StretchStamp, now: StretchStamp): void {
    this.total--;
    if (now.lapOrdinal > at.lapOrdinal) this.atLap--;
    if (now.phaseOrdinal > at.phaseOrdinal) this.atPhase--;
    if (now.cellOrdinal > at.cellOrdinal) this.atCell--;
    const size = this.lapTotals.length;
    const oldest = Math.max(at.lapOrdinal + 1, now.lapOrdinal - size + 1);
    for (let ordinal = oldest; ordinal <= now.lapOrdinal && size > 0; ordinal++) {
      this.lapTotals[ordinal % size]!--;
    }
    this.history?.withdraw(at.timeUs, 1);
  }
}

/** When something was counted, by the ordinals of the stretches it fell into. */
export interface StretchStamp {
  readonly timeUs: number;
  readonly lapOrdinal: number;
  readonly phaseOrdinal: number;
  readonly cellOrdinal: number;
}
