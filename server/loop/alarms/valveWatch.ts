/**
 * What licking says of the valve. An animal that drinks licks on after a drop; one that still comes
 * licking and stops at once found nothing. Choices of our own: the first ten drops of a session are
 * what this animal does when it drinks.
 */
const BEFORE_US = 2_000_000;
const AFTER_US = 3_000_000;
const BASELINE_DROPS = 10;
const RECENT_DROPS = 5;
/** Mean licks after a drop that make a baseline worth comparing with. */
const LEAST_BASELINE = 4;
/** Fewer than this share of the baseline after a drop, while it still comes licking: empty. */
const EMPTY_SHARE = 1 / 3;
/** A bout without a pause, this long and this quick, is no bout any more. */
const DRIP_US = 30_000_000;
const PAUSE_US = 2_000_000;
const DRIP_PER_S = 2;
const LICKS_KEPT = 64;

interface Drop {
  readonly us: number;
  readonly before: number;
  after: number;
}

export class ValveWatch {
  #licksUs: number[] = [];
  #drops: Drop[] = [];
  #baseline: { readonly before: number; readonly after: number } | undefined;
  #boutUs = Number.NaN;
  #boutLicks = 0;
  #lastLickUs = Number.NEGATIVE_INFINITY;

  lick(us: number): void {
    if (us - this.#lastLickUs > PAUSE_US) {
      this.#boutUs = us;
      this.#boutLicks = 0;
    }
    this.#boutLicks++;
    this.#lastLickUs = us;
    this.#licksUs.push(us);
    if (this.#licksUs.length > LICKS_KEPT) this.#licksUs.shift();
    for (const drop of this.#drops) if (us >= drop.us && us - drop.us <= AFTER_US) drop.after++;
  }

  drop(us: number): void {
    const before = this.#licksUs.filter((lick) => us - lick <= BEFORE_US).length;
    this.#drops.push({ us, before, after: 0 });
    if (this.#baseline === undefined && this.#drops.length > BASELINE_DROPS) {
      this.#baseline = meanOf(this.#drops.slice(0, BASELINE_DROPS));
    }
    if (this.#drops.length > BASELINE_DROPS + RECENT_DROPS) this.#drops.shift();
  }

  /** Drops are no longer drunk though the animal comes for them. */
  get empty(): boolean {
    const base = this.#baseline;
    // The newest drop may still be drunk.
    const recent = this.#drops.slice(-RECENT_DROPS - 1, -1);
    if (base === undefined || base.after < LEAST_BASELINE || recent.length < RECENT_DROPS)
      return false;
    const now = meanOf(recent);
    return now.after < base.after * EMPTY_SHARE && now.before >= Math.max(1, base.before / 2);
  }

  /** Licking without a pause for longer than a drop lasts. */
  drips(nowUs: number): boolean {
    if (!(nowUs - this.#lastLickUs <= PAUSE_US)) return false;
    const us = this.#lastLickUs - this.#boutUs;
    return us >= DRIP_US && this.#boutLicks >= (DRIP_PER_S * us) / 1_000_000;
  }
}

function meanOf(drops: readonly Drop[]): { before: number; after: number } {
  const mean = (of: (drop: Drop) => number): number =>
    drops.reduce((sum, drop) => sum + of(drop), 0) / drops.length;
  return { before: mean(({ before }) => before), after: mean(({ after }) => after) };
}
