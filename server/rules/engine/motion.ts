import type { Instant } from '../instant.js';
import type { Run } from './run.js';

/** Adds up distance and time for `mean speed`; does nothing in a file that never reads it. */
export class Motion {
  private readonly distances: number[];
  private readonly durations: number[];

  constructor(private readonly run: Run) {
    const { tallies } = run.s.program;
    this.distances = tallies.flatMap((spec, n) => (spec.of === 'distance' ? [n] : []));
    this.durations = tallies.flatMap((spec, n) => (spec.of === 'duration' ? [n] : []));
  }

  /** A frame counts for a place when the animal is there at the frame's end. */
  step(i: Instant): void {
    if (this.distances.length === 0) return;
    const { s } = this.run;
    const counts = i.travelTo - i.travelFrom;
    this.add(this.distances, !Number.isNaN(counts) ? counts : 0);
    this.add(this.durations, s.nowUs - s.prevUs);
  }

  private add(tallies: readonly number[], amount: number): void {
    const { s } = this.run;
    for (let n = 0; n < tallies.length; n++) {
      const index = tallies[n]!;
      const span = s.program.tallies[index]!.subject;
      if (span >= 0 && !(s.placed && s.spans[span]!.contains(s.relativeCounts))) continue;
      s.tallies[index]!.add(amount, s.nowUs);
    }
  }
}
