/**
 * Mean speed and licks by position: the first laps beside the newest ones, which shows whether the
 * animal has learned where the spout is. Reckoned from the page's own 20 states a second: good to
 * look at, not to publish (the record has every count).
 */
export const BINS = 60;
export const PROFILE_LAPS = 10;

interface Sums {
  readonly speed: Float64Array;
  readonly samples: Uint32Array;
  readonly licks: Uint32Array;
}

export class Profile {
  version = 0;
  private readonly early = emptySums();
  private readonly laps = Array.from({ length: PROFILE_LAPS + 1 }, () => ({
    lap: -1,
    ...emptySums(),
  }));
  private newest = 0;

  addSpeed(lap: number, share: number, speedCmPerS: number): void {
    const bin = binOf(share);
    for (const sums of this.sumsOf(lap)) {
      sums.speed[bin]! += speedCmPerS;
      sums.samples[bin]!++;
    }
  }

  addLick(lap: number, share: number): void {
    for (const sums of this.sumsOf(lap)) sums.licks[binOf(share)]!++;
  }

  /** Mean speed by bin, cm/s, NaN where the animal was never seen; into `out`. */
  speedInto(out: Float64Array, which: 'early' | 'recent'): void {
    for (let bin = 0; bin < BINS; bin++) {
      let speed = 0;
      let samples = 0;
      for (const sums of this.group(which)) {
        speed += sums.speed[bin]!;
        samples += sums.samples[bin]!;
      }
      out[bin] = samples > 0 ? speed / samples : Number.NaN;
    }
  }

  /** Licks per lap by bin; into `out`. */
  licksInto(out: Float64Array, which: 'early' | 'recent'): void {
    const laps =
      which === 'early'
        ? Math.min(this.newest, PROFILE_LAPS)
        : Math.min(Math.max(0, this.newest - PROFILE_LAPS), PROFILE_LAPS);
    out.fill(0);
    if (laps === 0) return;
    for (const sums of this.group(which)) {
      for (let bin = 0; bin < BINS; bin++) out[bin]! += sums.licks[bin]! / laps;
    }
  }

  /** Whether there are laps after the first ten to compare with. */
  get comparable(): boolean {
    return this.newest > PROFILE_LAPS;
  }

  clear(): void {
    this.newest = 0;
    this.version++;
    clearSums(this.early);
    for (const sums of this.laps) {
      sums.lap = -1;
      clearSums(sums);
    }
  }

  private group(which: 'early' | 'recent'): Sums[] {
    if (which === 'early') return [this.early];
    return this.laps.filter(
      (sums) => sums.lap > PROFILE_LAPS && sums.lap > this.newest - PROFILE_LAPS,
    );
  }

  private sumsOf(lap: number): Sums[] {
    if (lap < 1) return [];
    this.version++;
    this.newest = Math.max(this.newest, lap);
    if (lap <= PROFILE_LAPS) return [this.early];
    if (lap <= this.newest - this.laps.length) return [];
    const slot = this.laps[lap % this.laps.length]!;
    if (slot.lap !== lap) {
      slot.lap = lap;
      clearSums(slot);
    }
    return [slot];
  }
}

function binOf(share: number): number {
  return Math.min(BINS - 1, Math.max(0, Math.floor(share * BINS)));
}

function emptySums(): Sums {
  return {
    speed: new Float64Array(BINS),
    samples: new Uint32Array(BINS),
    licks: new Uint32Array(BINS),
  };
}

function clearSums(sums: Sums): void {
  sums.speed.fill(0);
  sums.samples.fill(0);
  sums.licks.fill(0);
}
