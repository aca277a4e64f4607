const MOST = 512;

/**
 * On-time of one output in a sliding window. Exact while at most 512 firings lie in it, a train
 * being one; beyond that neighbours are joined and taken as later than they were, which can only
 * count too much.
 */
export class DutyWindow {
  readonly windowUs: number;
  /** Most on-time in any window. */
  readonly budgetUs: number;
  #startUs = new Float64Array(16);
  #widthUs = new Float64Array(16);
  #periodUs = new Float64Array(16);
  #onUs = new Float64Array(16);
  #size = 0;

  constructor(share: number, windowUs: number) {
    this.windowUs = windowUs;
    this.budgetUs = Math.floor(share * windowUs);
  }

  /** Pulses of `widthUs` every `periodUs` from `startUs` on, `onUs` of on-time in all. */
  add(startUs: number, widthUs: number, periodUs: number, onUs: number): void {
    if (this.#size === MOST) this.#join();
    else if (this.#size === this.#onUs.length) this.#grow();
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

  /** Joins the two neighbours whose joining moves on-time least. */
  #join(): void {
    let at = 0;
    let least = Number.POSITIVE_INFINITY;
    for (let i = 0; i + 1 < this.#size; i++) {
      const cost = this.#onUs[i]! * Math.abs(this.#endUs(i + 1) - this.#endUs(i));
      if (cost < least) {
        least = cost;
        at = i;
      }
    }
    const onUs = this.#onUs[at]! + this.#onUs[at + 1]!;
    const endUs = Math.max(this.#endUs(at), this.#endUs(at + 1));
    this.#put(at, endUs, onUs, onUs, onUs);
    this.#size--;
    for (let i = at + 1; i < this.#size; i++) this.#copy(i + 1, i);
  }

  #grow(): void {
    this.#startUs = doubled(this.#startUs);
    this.#widthUs = doubled(this.#widthUs);
    this.#periodUs = doubled(this.#periodUs);
    this.#onUs = doubled(this.#onUs);
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

function doubled(array: Float64Array<ArrayBuffer>): Float64Array<ArrayBuffer> {
  const larger = new Float64Array(array.length * 2);
  larger.set(array);
  return larger;
}
