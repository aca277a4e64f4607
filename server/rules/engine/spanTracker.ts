/**
 * Follows one span as the belt runs: which of its edges was passed last, and how far the animal may
 * go either way before anything happens. Edges are numbered along the unrolled belt: edge 2k is the
 * span's start on lap k, edge 2k + 1 its end; the animal is inside after an even one.
 *
 * Hysteresis: a crossing is seen at the edge itself; the crossing back over the same edge is seen
 * there too if the animal has been a hysteresis beyond it, and otherwise only once it is a
 * hysteresis beyond it on the side it came from.
 */
export class SpanTracker {
  /** Offsets within a lap, counts; `length` may reach over the seam. NaN: not known. */
  startCounts = Number.NaN;
  lengthCounts = 0;
  visiting = false;
  /** Something happens when travel is at least `upper`, or below `lower`. */
  upper = Number.POSITIVE_INFINITY;
  lower = Number.NEGATIVE_INFINITY;
  private edge = 0;
  /** 1: the last edge was just crossed forwards; -1: the next one was just crossed backwards. */
  private fresh = 0;
  /** How far below a freshly crossed edge the crossing back is seen. */
  private slack = 0;
  private lapCounts = 1;
  private hysteresisCounts = 0;

  get known(): boolean {
    return !Number.isNaN(this.startCounts);
  }

  /** Is a place within the lap, in counts from its start, inside? The end itself is not. */
  contains(relativeCounts: number): boolean {
    const into = relativeCounts - this.startCounts;
    return into >= 0 ? into < this.lengthCounts : into + this.lapCounts < this.lengthCounts;
  }

  /**
   * Sets where the span lies, and where the animal is in it, with nothing entered or left thereby.
   * A visit goes on only if the animal is inside before and after.
   */
  locate(
    startCounts: number,
    lengthCounts: number,
    lapCounts: number,
    hysteresisCounts: number,
    travel: number,
  ): void {
    this.startCounts = startCounts;
    this.lengthCounts = lengthCounts;
    this.lapCounts = lapCounts;
    this.hysteresisCounts = hysteresisCounts;
    this.relocate(travel);
  }

  /** The animal is elsewhere without having moved there: edges between are missed. */
  relocate(travel: number): void {
    if (!this.known || Number.isNaN(travel)) {
      this.visiting = false;
      this.upper = Number.POSITIVE_INFINITY;
      this.lower = Number.NEGATIVE_INFINITY;
      return;
    }
    const turn = Math.floor((travel - this.startCounts) / this.lapCounts);
    const inside = travel - this.startCounts - turn * this.lapCounts < this.lengthCounts;
    this.edge = 2 * turn + (inside ? 0 : 1);
    this.fresh = 0;
    if (!inside) this.visiting = false;
    this.setBounds();
  }

  /** A correction backwards: edges that the animal is put back over do not come again. */
  corrected(fromTravel: number, toTravel: number): void {
    if (!this.known) return;
    if (toTravel > fromTravel) {
      if (toTravel >= this.nextEdgeTravel()) this.relocate(toTravel);
    } else if (toTravel < this.lastEdgeTravel()) {
      this.fresh = 1;
      this.slack = this.lastEdgeTravel() - toTravel + this.hysteresisCounts;
      this.setBounds();
    }
  }

  /**
   * Takes the next event on the way to `travel`.
   * @returns 1 entered, -1 left, 0 nothing more; `crossedTravel` and `forwards` say where and how
   */
  next(travel: number): 1 | -1 | 0 {
    for (;;) {
      if (travel >= this.upper) {
        if (this.fresh === 1 && this.upper < this.nextEdgeTravel()) {
          this.fresh = 0;
          this.setBounds();
          continue;
        }
        this.edge++;
        this.crossedTravel = this.lastEdgeTravel();
        this.forwards = true;
        this.fresh = 1;
        this.slack = this.hysteresisCounts;
        this.setBounds();
        return this.crossed((this.edge & 1) === 0);
      }
      if (travel < this.lower) {
        if (this.fresh === -1 && this.lower > this.lastEdgeTravel()) {
          this.fresh = 0;
          this.setBounds();
          continue;
        }
        this.crossedTravel = this.lastEdgeTravel();
        this.forwards = false;
        this.edge--;
        this.fresh = -1;
        this.setBounds();
        return this.crossed((this.edge & 1) === 0);
      }
      return 0;
    }
  }
  crossedTravel = 0;
  forwards = true;

  /** Where the animal would next enter (or leave) going forwards, if that would be seen there. */
  aheadTravel(entering: boolean): number {
    if (!this.known) return Number.NaN;
    const nextIsStart = ((this.edge + 1) & 1) === 0;
    if (nextIsStart === entering) return this.fresh === -1 ? Number.NaN : this.nextEdgeTravel();
    return this.edgeTravel(this.edge + 2);
  }

  private crossed(entered: boolean): 1 | -1 {
    this.visiting = entered;
    return entered ? 1 : -1;
  }

  private setBounds(): void {
    const last = this.lastEdgeTravel();
    const next = this.nextEdgeTravel();
    const beyond = this.hysteresisCounts;
    if (this.fresh === 1) {
      this.lower = last - this.slack;
      this.upper = Math.min(last + beyond, next);
    } else if (this.fresh === -1) {
      this.upper = next + beyond;
      this.lower = Math.max(next - beyond, last);
    } else {
      this.lower = last;
      this.upper = next;
    }
  }

  private lastEdgeTravel(): number {
    return this.edgeTravel(this.edge);
  }
  private nextEdgeTravel(): number {
    return this.edgeTravel(this.edge + 1);
  }
  private edgeTravel(edge: number): number {
    const turn = Math.floor(edge / 2);
    const start = turn * this.lapCounts + this.startCounts;
    return edge - 2 * turn === 0 ? start : start + this.lengthCounts;
  }
}
