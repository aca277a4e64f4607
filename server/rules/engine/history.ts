/**
 * Totals as they stood at past instants, kept only as far back as the longest window that the rules
 * file reads, plus the one entry before it. Two columns in a ring that doubles when a window holds
 * more than it was made for; so it is bounded by the window, never by the session.
 */
export class History {
  private times = new Float64Array(64);
  private totals = new Float64Array(64);
  private head = 0;
  private count = 0;

  /**
   * @param windowUs the longest window that will be asked for
   * @param leastGapUs entries closer than this are merged into the newer one
   */
  constructor(
    private readonly windowUs: number,
    private readonly leastGapUs: number,
  ) {}

  /** Notes the total from this time on. Times never go back. */
  push(timeUs: number, total: number): void {
    const mask = this.times.length - 1;
    if (this.count > 0) {
      const last = (this.head + this.count - 1) & mask;
      const before = this.count > 1 ? this.times[(last - 1) & mask]! : Number.NEGATIVE_INFINITY;
      if (this.times[last] === timeUs || timeUs - before < this.leastGapUs) {
        this.times[last] = timeUs;
        this.totals[last] = total;
        return;
      }
    }
    const oldestNeeded = timeUs - this.windowUs;
    while (this.count > 1 && this.times[(this.head + 1) & mask]! <= oldestNeeded) {
      this.head = (this.head + 1) & mask;
      this.count--;
    }
    if (this.count === this.times.length) this.grow();
    const at = (this.head + this.count) & (this.times.length - 1);
    this.times[at] = timeUs;
    this.totals[at] = total;
    this.count++;
  }

  /** The total at a time no further back than the window: that of the last entry not after it. */
  at(timeUs: number): number {
    const mask = this.times.length - 1;
    let low = 0;
    let high = this.count;
    while (low < high) {
      const middle = (low + high) >> 1;
      if (this.times[(this.head + middle) & mask]! <= timeUs) low = middle + 1;
      else high = middle;
    }
    return low === 0 ? 0 : this.totals[(this.head + low - 1) & mask]!;
  }

  /** Takes an amount noted at that time out again. */
  withdraw(timeUs: number, amount: number): void {
    const mask = this.times.length - 1;
    for (let n = this.count - 1; n >= 0; n--) {
      const at = (this.head + n) & mask;
      if (this.times[at]! < timeUs) return;
      this.totals[at] = this.totals[at]! - amount;
    }
  }

  private grow(): void {
    const size = this.times.length;
    const times = new Float64Array(size * 2);
    const totals = new Float64Array(size * 2);
    for (let n = 0; n < this.count; n++) {
      times[n] = this.times[(this.head + n) & (size - 1)]!;
      totals[n] = this.totals[(this.head + n) & (size - 1)]!;
    }
    this.times = times;
    this.totals = totals;
    this.head = 0;
  }
}
