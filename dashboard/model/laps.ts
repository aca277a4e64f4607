/** What happened where, for the newest laps only: fixed memory, whatever the session's length. */

export const LAPS_KEPT = 40;
/** Marks kept in one lap; beyond it they are counted and not drawn. */
export const MARKS_A_LAP = 600;

export const MARK = {
  lick: 0,
  artefact: 1,
  water: 2,
  stimulus: 3,
  sham: 4,
  missed: 5,
  withheld: 6,
} as const;
export type Mark = (typeof MARK)[keyof typeof MARK];
export const MARK_KINDS = 7;

export interface LapMarks {
  /** -1 while the slot is empty. */
  lap: number;
  count: number;
  readonly positionCm: Float32Array;
  readonly kind: Uint8Array;
  /** How many of each kind, the ones not kept included. */
  readonly totals: Uint32Array;
}

/** A ring of laps by number: lap n lives in slot n mod `LAPS_KEPT`. */
export class LapStore {
  /** The newest lap seen; -1 before any. */
  newest = -1;
  /** Grows with every change; who draws compares it with what was drawn. */
  version = 0;
  private readonly slots: LapMarks[] = Array.from({ length: LAPS_KEPT }, emptyLap);

  /** Lap `lap` has begun, or is known to exist. */
  reach(lap: number): void {
    if (lap > this.newest) {
      this.newest = lap;
      this.version++;
    }
  }

  add(lap: number, positionCm: number, kind: Mark): void {
    this.reach(lap);
    if (lap <= this.newest - LAPS_KEPT || lap < 0) return;
    const slot = this.slots[lap % LAPS_KEPT]!;
    if (slot.lap !== lap) clearLap(slot, lap);
    slot.totals[kind]!++;
    this.version++;
    if (slot.count === MARKS_A_LAP) return;
    slot.positionCm[slot.count] = positionCm;
    slot.kind[slot.count] = kind;
    slot.count++;
  }

  /** The marks of a lap, or undefined when it had none or is no longer kept. */
  get(lap: number): LapMarks | undefined {
    if (lap < 0 || lap > this.newest || lap <= this.newest - LAPS_KEPT) return undefined;
    const slot = this.slots[lap % LAPS_KEPT]!;
    return slot.lap === lap ? slot : undefined;
  }

  clear(): void {
    this.newest = -1;
    this.version++;
    for (const slot of this.slots) clearLap(slot, -1);
  }
}

function emptyLap(): LapMarks {
  return {
    lap: -1,
    count: 0,
    positionCm: new Float32Array(MARKS_A_LAP),
    kind: new Uint8Array(MARKS_A_LAP),
    totals: new Uint32Array(MARK_KINDS),
  };
}

function clearLap(slot: LapMarks, lap: number): void {
  slot.lap = lap;
  slot.count = 0;
  slot.totals.fill(0);
}
