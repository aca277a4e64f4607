/**
 * Follows one point by progress, the furthest the animal has come: it is reached at most once a
 * lap, however the animal or the point moves.
 */
export class ReachTracker {
  /** Counts from the lap's start; NaN: not known. */
  offsetCounts = Number.NaN;
  /** The travel at which it will next be reached. */
  targetTravel = Number.POSITIVE_INFINITY;
  private lastLap = 0;
  private lapCounts = 1;

  /** Sets where the point is; what lies behind the animal's progress is not reached thereby. */
  locate(offsetCounts: number, lapCounts: number, progress: number): void {
    this.offsetCounts = offsetCounts;
    this.lapCounts = lapCounts;
    this.aim(progress);
  }

  /** Aims at the next place ahead, on a lap on which it has not been reached. */
  aim(progress: number): void {
    if (Number.isNaN(this.offsetCounts) || Number.isNaN(progress)) {
      this.targetTravel = Number.POSITIVE_INFINITY;
      return;
    }
    let lap = Math.floor((progress - this.offsetCounts) / this.lapCounts) + 1;
    if (lap <= this.lastLap) lap = this.lastLap + 1;
    if (lap < 1) lap = 1;
    this.targetTravel = lap * this.lapCounts + this.offsetCounts;
  }

  /** Marks the target as reached. */
  take(): void {
    this.lastLap = Math.floor(this.targetTravel / this.lapCounts);
  }
}

/** Follows the rows of a table of laps and places, in order; each comes once. */
export class RowTracker {
  row = 0;
  targetTravel = Number.POSITIVE_INFINITY;

  constructor(
    private readonly lap: readonly number[],
    private readonly placeCm: readonly number[],
  ) {}

  /** Aims at the present row. */
  aim(lapCounts: number, countsPerCm: number): void {
    const place = this.placeCm[this.row];
    this.targetTravel =
      place === undefined
        ? Number.POSITIVE_INFINITY
        : this.lap[this.row]! * lapCounts + Math.floor(place * countsPerCm + 0.5);
  }
}
