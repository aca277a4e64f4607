import type { Instant } from '../instant.js';
import type { Run } from './run.js';

/**
 * What the belt's movement brings: laps begun, places reached, spans entered and left. Between two
 * events it costs three comparisons a frame, however many places there are.
 */
export class Movement {
  private nextReach = Number.POSITIVE_INFINITY;
  private nextUpper = Number.POSITIVE_INFINITY;
  private nextLower = Number.NEGATIVE_INFINITY;
  private readonly tracked: number[];
  private readonly rowRules: number[];
  private readonly anyMoving: boolean;
  /** A visit to a span that a draw names began in this instant. */
  readonly visitDraws: number[] = [];

  constructor(private readonly run: Run) {
    const { program } = run.s;
    this.tracked = program.spans.flatMap((span, n) => (span.tracked ? [n] : []));
    this.rowRules = program.rules.flatMap((rule, n) => (rule.when.kind === 'places' ? [n] : []));
    this.anyMoving =
      program.spans.some((span) => span.moving) || program.points.some((point) => point.moving);
  }

  /**
   * @param lapBegan whether this instant begins a lap; at a session's start also on a rig without a
   *   seam mark, whose first lap begins there
   */
  step(i: Instant, lapBegan: boolean): void {
    const { s } = this.run;
    if (!i.placed) {
      if (s.placed) this.lost();
      s.lap = i.lap;
      return;
    }
    if (i.lapCounts !== s.lapCounts) this.setScale(i.lapCounts);
    // A lap begins at its 0 cm, even where a correction has put the animal straight onto it.
    const least = lapBegan ? i.lap * i.lapCounts - 1 : Number.POSITIVE_INFINITY;
    const from = Math.min(i.travelFrom, least);
    const furthest = Math.min(i.progressFrom, least);
    if (!s.placed) {
      s.placed = true;
      s.travel = from;
      s.progress = furthest;
      this.resolve();
    } else if (from !== s.travel || furthest !== s.progress) {
      this.corrected(from, furthest);
    }
    if (lapBegan) this.lapBegan(i);
    s.lap = i.lap;
    if (i.progressTo >= this.nextReach) this.reach(i);
    if (i.travelTo >= this.nextUpper || i.travelTo < this.nextLower) this.cross(i);
    s.travel = i.travelTo;
    s.progress = i.progressTo;
    s.relativeCounts = i.travelTo - Math.floor(i.travelTo / s.lapCounts) * s.lapCounts;
    if (this.anyMoving) this.resolve();
  }

  /** Travel at which something happens next as the animal goes on; Infinity: nothing waits. */
  get nextAhead(): number {
    return Math.min(this.nextReach, this.nextUpper);
  }
  /** Travel below which something happens as it goes back. */
  get nextBehind(): number {
    return this.nextLower;
  }

  /** Reckons every place anew: a phase, a draw or a choice may have moved it. */
  resolve(): void {
    const { s } = this.run;
    const { program } = s;
    const travel = s.placed ? s.travel : Number.NaN;
    const beyond = Math.floor(program.facts.hysteresisCm * s.countsPerCm + 0.5);
    for (let n = 0; n < s.spans.length; n++) {
      const spec = program.spans[n]!;
      const tracker = s.spans[n]!;
      const from = spec.from(s);
      const to = spec.to(s);
      const first = this.counts(from);
      let length = this.counts(to < from ? to + program.facts.beltLengthCm : to) - first;
      if (length > s.lapCounts) length = s.lapCounts;
      const start = first - Math.floor(first / s.lapCounts) * s.lapCounts;
      tracker.locate(start, length, s.lapCounts, beyond, travel);
    }
    const progress = s.placed ? s.progress : Number.NaN;
    for (let n = 0; n < s.points.length; n++) {
      const offset = this.counts(program.points[n]!.place(s));
      s.points[n]!.locate(
        offset - Math.floor(offset / s.lapCounts) * s.lapCounts,
        s.lapCounts,
        progress,
      );
    }
    for (let n = 0; n < this.rowRules.length; n++) {
      s.rules[this.rowRules[n]!]!.rows!.aim(s.lapCounts, s.countsPerCm);
    }
    this.skipRows(s.progress);
    this.setBounds();
  }

  private counts(cm: number): number {
    return Math.floor(cm * this.run.s.countsPerCm + 0.5);
  }

  private setScale(lapCounts: number): void {
    const { s } = this.run;
    s.lapCounts = lapCounts;
    s.countsPerCm = lapCounts / s.program.facts.beltLengthCm;
    if (s.placed) this.resolve();
  }

  private lost(): void {
    const { s } = this.run;
    s.placed = false;
    s.relativeCounts = Number.NaN;
    this.resolve();
  }

  private lapBegan(i: Instant): void {
    const { s } = this.run;
    const begun = i.lap > s.lap ? i.lap - s.lap : 1;
    s.lapUs = s.nowUs;
    for (let n = 1; n <= begun; n++) {
      s.lapOrdinal++;
      const whole = s.lap + n >= 2;
      for (let t = 0; t < s.tallies.length; t++) {
        if (whole && s.program.tallies[t]!.of === 'laps') s.tallies[t]!.add(1, s.nowUs);
        s.tallies[t]!.lapBegan(s.lapOrdinal);
      }
    }
    this.run.moments(s.program.lapRules, s.nowUs, i.lap * s.lapCounts);
  }

  /** The animal is elsewhere without having moved there. */
  private corrected(travel: number, progress: number): void {
    const { run } = this;
    const { s } = run;
    for (let n = 0; n < this.tracked.length; n++) {
      s.spans[this.tracked[n]!]!.corrected(s.travel, travel);
    }
    for (let n = 0; n < s.points.length; n++) {
      const point = s.points[n]!;
      if (point.targetTravel > progress) continue;
      for (const rule of s.program.points[n]!.rules) run.jumpedOver(rule);
      point.aim(progress);
    }
    this.skipRows(progress);
    s.travel = travel;
    s.progress = progress;
    this.setBounds();
  }

  /** Rows of a table that lie behind the animal will not come. */
  private skipRows(progress: number): void {
    const { s } = this.run;
    if (!s.placed) return;
    for (let n = 0; n < this.rowRules.length; n++) {
      const rule = this.rowRules[n]!;
      const rows = s.rules[rule]!.rows!;
      while (rows.targetTravel <= progress) {
        this.run.jumpedOver(rule);
        rows.row++;
        rows.aim(s.lapCounts, s.countsPerCm);
      }
    }
  }

  private reach(i: Instant): void {
    const { run } = this;
    const { s } = run;
    for (let n = 0; n < s.points.length; n++) {
      const point = s.points[n]!;
      const spec = s.program.points[n]!;
      while (point.targetTravel <= i.progressTo) {
        const place = point.targetTravel;
        run.moments(spec.rules, this.causeUs(place, s.progress, i.progressTo), place);
        for (let m = 0; m < spec.marks.length; m++) run.touch(spec.marks[m]!);
        point.take();
        point.aim(place);
      }
    }
    for (let n = 0; n < this.rowRules.length; n++) {
      const rule = this.rowRules[n]!;
      const rows = s.rules[rule]!.rows!;
      while (rows.targetTravel <= i.progressTo) {
        const place = rows.targetTravel;
        run.moment(rule, this.causeUs(place, s.progress, i.progressTo), place);
        rows.row++;
        rows.aim(s.lapCounts, s.countsPerCm);
      }
    }
    this.setBounds();
  }

  private cross(i: Instant): void {
    const { run } = this;
    const { s } = run;
    for (let n = 0; n < this.tracked.length; n++) {
      const index = this.tracked[n]!;
      const tracker = s.spans[index]!;
      const spec = s.program.spans[index]!;
      for (let event = tracker.next(i.travelTo); event !== 0; event = tracker.next(i.travelTo)) {
        const place = tracker.crossedTravel;
        const causeUs = this.causeUs(place, s.travel, i.travelTo);
        const marks = event > 0 ? spec.enterMarks : spec.leaveMarks;
        for (let m = 0; m < marks.length; m++) run.touch(marks[m]!);
        run.moments(event > 0 ? spec.enterRules : spec.leaveRules, causeUs, place);
        if (event < 0) continue;
        for (const tally of spec.visitTallies) s.tallies[tally]!.visitBegan();
        for (const draw of spec.visitDraws) this.visitDraws.push(draw);
      }
    }
    this.setBounds();
  }

  /** When a place between two frames was passed: by their share of the way, never later than now. */
  private causeUs(place: number, from: number, to: number): number {
    const { s } = this.run;
    const share = (place - from) / (to - from);
    if (!(share > 0 && share < 1)) return s.nowUs;
    return s.prevUs + Math.floor(share * (s.nowUs - s.prevUs));
  }

  private setBounds(): void {
    const { s } = this.run;
    this.run.targetsChanged = true;
    this.nextReach = Number.POSITIVE_INFINITY;
    this.nextUpper = Number.POSITIVE_INFINITY;
    this.nextLower = Number.NEGATIVE_INFINITY;
    for (let n = 0; n < s.points.length; n++) {
      const { targetTravel } = s.points[n]!;
      if (targetTravel < this.nextReach) this.nextReach = targetTravel;
    }
    for (let n = 0; n < this.rowRules.length; n++) {
      const { targetTravel } = s.rules[this.rowRules[n]!]!.rows!;
      if (targetTravel < this.nextReach) this.nextReach = targetTravel;
    }
    for (let n = 0; n < this.tracked.length; n++) {
      const { upper, lower } = s.spans[this.tracked[n]!]!;
      if (upper < this.nextUpper) this.nextUpper = upper;
      if (lower > this.nextLower) this.nextLower = lower;
    }
  }
}
