/** Speed over the last minute of board time, in a ring that `view` lays out flat for the plot. */

export const TRACE_S = 60;
const CAPACITY = 2048;

export class SpeedTrace {
  version = 0;
  private readonly timeS = new Float64Array(CAPACITY);
  private readonly speed = new Float64Array(CAPACITY);
  private readonly flatTime = new Float64Array(CAPACITY);
  private readonly flatSpeed = new Float64Array(CAPACITY);
  private next = 0;
  private count = 0;

  /** Board time in microseconds, which never goes back but when the board was restarted. */
  add(boardUs: number, speedCmPerS: number): void {
    const timeS = boardUs / 1e6;
    const last = this.count > 0 ? this.timeS[(this.next + CAPACITY - 1) % CAPACITY]! : -1;
    if (timeS === last) return;
    if (timeS < last) this.clear();
    this.timeS[this.next] = timeS;
    this.speed[this.next] = speedCmPerS;
    this.next = (this.next + 1) % CAPACITY;
    this.count = Math.min(this.count + 1, CAPACITY);
    this.version++;
  }

  clear(): void {
    this.count = 0;
    this.next = 0;
    this.version++;
  }

  /**
   * Seconds before the newest value (negative), and cm/s, oldest first, of the last `TRACE_S`. The
   * arrays are reused at the next call.
   */
  view(): [Float64Array, Float64Array] {
    const newest = this.timeS[(this.next + CAPACITY - 1) % CAPACITY]!;
    let kept = 0;
    for (let n = 0; n < this.count; n++) {
      const at = (this.next - this.count + n + CAPACITY) % CAPACITY;
      const before = this.timeS[at]! - newest;
      if (before < -TRACE_S) continue;
      this.flatTime[kept] = before;
      this.flatSpeed[kept] = this.speed[at]!;
      kept++;
    }
    return [this.flatTime.subarray(0, kept), this.flatSpeed.subarray(0, kept)];
  }
}
