const CAPACITY = 512;

/**
 * On-time of one output in a sliding window. Exact for the last 256 firings at least, a train
 * being one; where more fall into the window, older ones are joined in pairs and taken as later
 * than they were, which can only count too much.
 */
export class DutyWindow {
  readonly windowUs: number;
  /** Most on-time in any window. */
  readonly budgetUs: number;
  readonly #startUs = new Float64Array(CAPACITY);
  readonly #widthUs = new Float64Array(CAPACITY);
  readonly #periodUs = new Float64Array(CAPACITY);
  readonly #onUs = new Float64Array(CAPACITY);
  #size = 0;

  constructor(share: number, windowUs: number) {
    this.windowUs = windowUs;
    this.budgetUs = Math.floor(share * windowUs);
  }

  /** Pulses of `widthUs` every `periodUs` from `startUs` on, `onUs` of on-time in all. */
  add(startUs: number, widthUs: number, periodUs: number, onUs: number): void {
    if (this.#size === CAPACITY) this.#halve();
    this.#put(this.#size++, startUs, widthUs, periodUs, onUs);
  }

  /** Forgets what lies wholly before `us`. */
  forget(us: number): void {
    let kept = 0;
    for (let i = 0; i < this.#size; i++) {
      if (this.#onAfter(i, us) === 0) continue;
      if (kept !== i) this.#copy(i, kept);
      kept++;
    }
    this.#size = kept;
  }

  /** On-time after `us`. */
  onSince(us: number): number {
    let sum = 0;
    for (let i = 0; i < this.#size; i++) sum += this.#onAfter(i, us);
    return sum;
  }

  #onAfter(i: number, us: number): number {
    const onUs = this.#onUs[i]!;
    const gone = us - this.#startUs[i]!;
    if (gone <= 0) return onUs;
    const periodUs = this.#periodUs[i]!;
    const widthUs = this.#widthUs[i]!;
    const whole = Math.floor(gone / periodUs);
    const before = whole * widthUs + Math.min(widthUs, gone - whole * periodUs);
    return before >= onUs ? 0 : onUs - before;
  }

  #endUs(i: number): number {
    const pulses = Math.ceil(this.#onUs[i]! / this.#widthUs[i]!);
    const lastOnUs = this.#onUs[i]! - (pulses - 1) * this.#widthUs[i]!;
    return this.#startUs[i]! + (pulses - 1) * this.#periodUs[i]! + lastOnUs;
  }

  #halve(): void {
    for (let i = 0; i + 1 < this.#size; i += 2) {
      const onUs = this.#onUs[i]! + this.#onUs[i + 1]!;
      const endUs = Math.max(this.#endUs(i), this.#endUs(i + 1));
      this.#put(i >> 1, endUs, onUs, onUs, onUs);
    }
    this.#size >>= 1;
  }

  #put(i: number, startUs: number, widthUs: number, periodUs: number, onUs: number): void {
    this.#startUs[i] = startUs;
    this.#widthUs[i] = widthUs;
    this.#periodUs[i] = periodUs;
    this.#onUs[i] = onUs;
  }

  #copy(from: number, to: number): void {
    this.#startUs[to] = this.#startUs[from]!;
    this.#widthUs[to] = this.#widthUs[from]!;
    this.#periodUs[to] = this.#periodUs[from]!;
    this.#onUs[to] = this.#onUs[from]!;
  }
}
