import { DRINKING_US } from '../learned.js';
import type { LickWaiter } from './program.js';
import type { Run } from './run.js';

/** What a lick brings: counts, marks, and moments of the rules that wait for licks. */
export class Licking {
  private readonly lickTallies: number[];
  /** Of licks that do not drink a drop. */
  private readonly waitingTallies: number[];
  /** Times of the last licks that a bout looks back over, per waiter. */
  private readonly bouts: (Float64Array | undefined)[];
  private readonly boutCounts: number[];

  constructor(private readonly run: Run) {
    const { program } = run.s;
    this.lickTallies = program.tallies.flatMap((spec, n) => (spec.of === 'licks' ? [n] : []));
    this.waitingTallies = program.tallies.flatMap((spec, n) =>
      spec.of === 'waiting licks' ? [n] : [],
    );
    this.bouts = program.lickWaiters.map((waiter) => {
      return waiter.bout ? new Float64Array(waiter.bout.most + 1) : undefined;
    });
    this.boutCounts = program.lickWaiters.map(() => 0);
  }

  /** A lick at this instant. */
  lick(): void {
    const { run } = this;
    const { s } = run;
    const { program } = s;
    for (const index of this.lickTallies) {
      if (this.isIn(program.tallies[index]!.subject)) s.tallies[index]!.add(1, s.nowUs);
    }
    if (s.nowUs - s.dropUs >= DRINKING_US) {
      for (const index of this.waitingTallies) {
        if (this.isIn(program.tallies[index]!.subject)) s.tallies[index]!.add(1, s.nowUs);
      }
    }
    for (const { span, mark } of program.lickMarks) if (this.isIn(span)) run.touch(mark);
    for (let n = 0; n < program.lickWaiters.length; n++) {
      const waiter = program.lickWaiters[n]!;
      if (!this.isIn(waiter.span)) continue;
      if (this.comes(waiter, n)) run.moment(waiter.rule, s.nowUs, Number.NaN);
    }
  }

  private isIn(span: number): boolean {
    if (span < 0) return true;
    const { s } = this.run;
    return s.placed && s.spans[span]!.contains(s.relativeCounts);
  }

  private comes(waiter: LickWaiter, index: number): boolean {
    if (waiter.nth) return this.isNth(waiter, waiter.nth);
    if (waiter.bout) return this.isBout(waiter.bout, index);
    return true;
  }

  private isNth(waiter: LickWaiter, nth: NonNullable<LickWaiter['nth']>): boolean {
    const { s } = this.run;
    const tally = s.tallies[nth.tally]!;
    switch (nth.stretch) {
      case 'visit':
        return s.spans[waiter.span]!.visiting && tally.thisVisit() === nth.nth;
      case 'lap':
        return tally.thisLap() === nth.nth;
      case 'phase':
        return tally.thisPhase() === nth.nth;
      case 'cell':
        return tally.thisCell() === nth.nth;
      case 'session':
        return tally.total === nth.nth;
    }
  }

  /**
   * A bout comes with the lick that makes its number full; further licks belong to it, and the next
   * comes only after fewer than that number lay within the time.
   */
  private isBout(bout: NonNullable<LickWaiter['bout']>, index: number): boolean {
    const { s } = this.run;
    const times = this.bouts[index]!;
    const size = times.length;
    const licks = ++this.boutCounts[index]!;
    times[licks % size] = s.nowUs;
    const count = Math.floor(bout.count(s) + 0.5);
    const sinceUs = s.nowUs - bout.timeUs(s);
    if (!(count >= 1) || count >= size || licks < count) return false;
    if (!(times[(licks - count + 1) % size]! >= sinceUs)) return false;
    return licks === count || times[(licks - count) % size]! < sinceUs;
  }
}
