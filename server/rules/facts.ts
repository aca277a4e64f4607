/** What the checker and the engine must know of the rig; made from the rig file by `session/`. */
export interface RigFacts {
  readonly beltLengthCm: number;
  readonly beltToleranceCm: number;
  readonly countsPerCm: number;
  /** False: the session's start is 0 cm, and laps are reckoned from it. */
  readonly seamMark: boolean;
  /** A slip at the seam beyond this stops stimulation. */
  readonly slipAllowedCm: number;
  /** Below this speed, either way, the belt is `still`. */
  readonly stillBelowCmPerS: number;
  /** How far beyond an edge the animal must go before the crossing back counts. */
  readonly hysteresisCm: number;
  readonly outputs: readonly OutputFacts[];
  readonly inputs: readonly { readonly name: string; readonly index: number }[];
}

export interface OutputFacts {
  readonly name: string;
  readonly index: number;
  /** A `mark` (a sync line) is done when it can be and never holds back a firing. */
  readonly kind: 'valve' | 'stimulus' | 'mark';
  readonly longestOnUs: number;
  readonly leastGapUs: number;
  readonly perSession?: number;
  /** What it drives evokes a plateau in the cell recorded: each firing is taken for an induction. */
  readonly evokesPlateau?: boolean;
  /** At most `share` of any `windowUs` on. */
  readonly duty?: { readonly share: number; readonly windowUs: number };
  /** A valve's calibrated line: open for `deadUs + volumeNl * usPerNl`. */
  readonly valve?: {
    readonly deadUs: number;
    readonly usPerNl: number;
    readonly leastNl: number;
    readonly mostNl: number;
  };
}
