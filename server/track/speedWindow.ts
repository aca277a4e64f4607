/**
 * Signed speed over a window of board time, from a ring of the moments at which the count changed.
 *
 * Between two entries movement is taken as even, so a stretch in which frames were lost shows its
 * mean speed and not a jump; that the belt stood still is an entry too, so it is never smeared.
 */
export class SpeedWindow {
  /**
   * What goes into `take` and comes out. As arguments and result the three would be put on the heap
   * at every sample, 32 bytes of it.
   */
  readonly io = new Float64Array(3);
  readonly #windowUs: number;
  readonly #perWindow: number;
  readonly #mask: number;
  readonly #timeUs: Float64Array;
  readonly #moved: Float64Array;
  /** Entries `first` up to and without `next` are in use. */
  #first = 0;
  #next = 0;
  #lastUs = 0;
  #lastMoved = 0;

  /** @param windowUs at least 1 ms; two entries are kept for each millisecond of it */
  constructor(windowUs: number) {
    this.#windowUs = windowUs;
    this.#perWindow = 1 / windowUs;
    let size = 64;
    while (size < windowUs / 500 + 16) size *= 2;
    this.#mask = size - 1;
    this.#timeUs = new Float64Array(size);
    this.#moved = new Float64Array(size);
  }

  /** Forgets all movement: `moved` is where the belt stands now. */
  restart(nowUs: number, moved: number): void {
    this.#first = 0;
    this.#next = 0;
    this.#lastUs = nowUs;
    this.#lastMoved = moved;
    this.#push(nowUs, moved);
  }

  /**
   * Reckons speed anew: from `io[0]`, now in microseconds and never less than before, and `io[1]`,
   * counts moved so far, forwards less backwards; into `io[2]`, counts per microsecond, the mean
   * over the window that ends now.
   */
  take(): void {
    const nowUs = this.io[0]!;
    const moved = this.io[1]!;
    if (moved !== this.#lastMoved) {
      if (this.#timeUs[(this.#next - 1) & this.#mask]! < this.#lastUs) {
        this.#push(this.#lastUs, this.#lastMoved);
      }
      this.#push(nowUs, moved);
      this.#lastMoved = moved;
    }
    this.#lastUs = nowUs;
    const beganUs = nowUs - this.#windowUs;
    const timeUs = this.#timeUs;
    const mask = this.#mask;
    let first = this.#first;
    while (first + 1 < this.#next && timeUs[(first + 1) & mask]! <= beganUs) first++;
    this.#first = first;
    const at = first & mask;
    let before = this.#moved[at]!;
    if (first + 1 < this.#next && timeUs[at]! < beganUs) {
      const after = (first + 1) & mask;
      before +=
        ((this.#moved[after]! - before) * (beganUs - timeUs[at]!)) / (timeUs[after]! - timeUs[at]!);
    }
    this.io[2] = (moved - before) * this.#perWindow;
  }

  #push(timeUs: number, moved: number): void {
    const last = (this.#next - 1) & this.#mask;
    if (this.#next > this.#first && this.#timeUs[last] === timeUs) {
      this.#moved[last] = moved;
      return;
    }
    // Full only under a storm of edges: the oldest entries matter most, so the newest waits.
    if (this.#next - this.#first > this.#mask) return;
    const at = this.#next & this.#mask;
    this.#timeUs[at] = timeUs;
    this.#moved[at] = moved;
    this.#next++;
  }
}
