import type { Ahead, GapSpec } from './program.js';
import type { State } from './state.js';
import { TRUE } from './truth.js';

/** The pace is that of this many laps, or of as many as there are. */
const PACE_LAPS = 10;

/** How far something is, by one gap. */
interface Reckoned {
  readonly laps: number;
  /** Of a gap of time, how much of it; else NaN. */
  readonly us: number;
  readonly exact: boolean;
  readonly what: string;
  /** The gap it hangs on; -1: none, it is true already. */
  readonly gap: number;
}

const TRUE_ALREADY: Reckoned = { laps: 0, us: Number.NaN, exact: true, what: '', gap: -1 };

/**
 * How fast each gap has closed over the last laps, and so how many laps are left of it. What is
 * reckoned in laps is exact; the rest is an estimate, and never decides anything.
 */
export class Pace {
  /** When the last laps began, newest last, and what was lacking then, by gap. */
  private readonly beganUs: number[] = [];
  private readonly lacking: number[][] = [];
  private readonly gaps: readonly GapSpec[];

  constructor(private readonly s: State) {
    this.gaps = s.program.gaps;
  }

  /** Mean duration of the last laps, microseconds; NaN before the first whole one. */
  get lapUs(): number {
    const laps = this.beganUs.length - 1;
    return laps < 1 ? Number.NaN : (this.beganUs[laps]! - this.beganUs[0]!) / laps;
  }

  lapBegan(): void {
    this.beganUs.push(this.s.nowUs);
    this.lacking.push(this.gaps.map((gap) => gap.lacking(this.s)));
    if (this.beganUs.length <= PACE_LAPS + 1) return;
    this.beganUs.shift();
    this.lacking.shift();
  }

  /** What is counted by the phase began anew. */
  phaseBegan(): void {
    this.lacking.length = 0;
  }

  /** The one that comes true first; undefined where none can be foreseen. */
  nearest(aheads: readonly Ahead[]): Reckoned | undefined {
    return this.reckon({ kind: 'any', of: aheads });
  }

  /** The gap that a condition hangs on, or the first it names where no pace is known; -1: none. */
  gapOf(ahead: Ahead): number {
    return this.reckon(ahead)?.gap ?? firstGap(ahead);
  }

  private reckon(ahead: Ahead): Reckoned | undefined {
    switch (ahead.kind) {
      case 'test':
        return ahead.test(this.s) === TRUE ? TRUE_ALREADY : undefined;
      case 'gap':
        return this.reckonGap(ahead.gap);
      case 'any': {
        const found = ahead.of.flatMap((one) => this.reckon(one) ?? []);
        return found.reduce<Reckoned | undefined>(
          (a, b) => (a && !sooner(b, a) ? a : b),
          undefined,
        );
      }
      case 'all': {
        const all = ahead.of.map((one) => this.reckon(one));
        if (all.includes(undefined)) return undefined;
        return (all as Reckoned[]).reduce((a, b) => (sooner(a, b) ? b : a));
      }
    }
  }

  private reckonGap(index: number): Reckoned | undefined {
    const gap = this.gaps[index]!;
    const { what, unit } = gap;
    const lacking = gap.lacking(this.s);
    if (Number.isNaN(lacking) || lacking === Number.POSITIVE_INFINITY) return undefined;
    const time = unit === 'time';
    const base = { what, gap: index, exact: unit === 'laps', us: time ? lacking : Number.NaN };
    if (lacking <= 0) return { ...base, laps: 0 };
    if (unit === 'laps') return { ...base, laps: lacking };
    if (time) return { ...base, laps: Math.ceil(lacking / this.lapUs) };
    // By what whole laps brought, from where the present one began: in a lap it comes all at once.
    const laps = this.lacking.length - 1;
    if (laps < 1) return undefined;
    const began = this.lacking[laps]![index]!;
    const closed = (this.lacking[0]![index]! - began) / laps;
    return closed > 0 ? { ...base, laps: Math.ceil(began / closed) } : undefined;
  }
}

function firstGap(ahead: Ahead): number {
  if (ahead.kind === 'gap') return ahead.gap;
  if (ahead.kind === 'test') return -1;
  return ahead.of.map(firstGap).find((gap) => gap >= 0) ?? -1;
}

/** One without a pace is reckoned last. */
function sooner(a: Reckoned, b: Reckoned): boolean {
  if (Number.isNaN(a.laps)) return Number.isNaN(b.laps) && a.us < b.us;
  return Number.isNaN(b.laps) || a.laps < b.laps;
}
