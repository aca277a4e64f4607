/** What the tracker must know of the belt; made from the rig file and its calibration. */
export interface BeltConfig {
  readonly lengthCm: number;
  /** Encoder counts per centimetre of belt, after quadrature. */
  readonly countsPerCm: number;
  /** 1: counts rise as the animal runs forwards; -1: they fall. */
  readonly direction: 1 | -1;
  /** null: no mark; the session's start is 0 cm, and laps are reckoned from it. */
  readonly seam: SeamConfig | null;
  /** null: no lick sensor. */
  readonly lick: LickConfig | null;
  /** Stretch over which speed is taken. */
  readonly speedWindowUs?: number;
}

export interface SeamConfig {
  readonly input: number;
  /**
   * The place on the belt that is under the animal when the sensor meets the mark's leading edge,
   * cm. Positive: the seam has already gone by; negative: it is still to come.
   */
  readonly offsetCm: number;
  /** A slip beyond this is reported with a warning and does not restore trust. */
  readonly warnCm?: number;
  /** A mark further than this from where it should be is not believed. */
  readonly stopCm?: number;
}

export interface LickConfig {
  readonly input: number;
  /** After a lick's onset, no other begins for this long. */
  readonly lockoutUs?: number;
  /** A contact this soon after the last one broke is the same contact bouncing. */
  readonly bounceUs?: number;
  /** An onset this near a change of an output may be its electrical echo. */
  readonly artefactUs?: number;
  /** Outputs that can echo in the lick sensor, bit n for output n. */
  readonly artefactOutputs?: number;
  /** A contact longer than this is a wet or bridged sensor. */
  readonly stuckUs?: number;
  /** No animal licks faster. */
  readonly fastestHz?: number;
}

/** Speed over 100-250 ms: common practice, no source. */
export const SPEED_WINDOW_US = 200_000;
/**
 * Slip of 1-5 mm a lap is usual; 1 cm and 3 cm, and marks wider than 3 mm: common practice, no
 * source.
 */
export const SEAM_DEFAULTS = { warnCm: 1, stopCm: 3, bounceCm: 0.3 } as const;
/**
 * Lockout 40-60 ms, contacts of 15-80 ms at 5-9 Hz, nothing above 12 Hz, stuck after 1 s, an
 * output's echo within 5 ms: common practice, no source. The bounce is shorter than the shortest
 * break between two licks (111 ms at 9 Hz, less 80 ms of contact).
 */
export const LICK_DEFAULTS = {
  lockoutUs: 50_000,
  bounceUs: 5_000,
  artefactUs: 5_000,
  artefactOutputs: 0xffff,
  stuckUs: 1_000_000,
  fastestHz: 12,
} as const;

/**
 * With no frame for longer than this, nobody can say when a place was passed, so places passed
 * meanwhile are missed. The board sends every 5 ms; a firing is late 50 ms after its moment.
 */
export const UNSEEN_US = 50_000;
