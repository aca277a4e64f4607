import type { OutputFacts, RigFacts } from '../../rules/facts.js';
import type { AlarmLevel } from '../inputs.js';
import type { Calibration } from './calibration.js';

/** A rig file, read and checked; amounts in cm, microseconds, cm/s, nanolitres. */
export interface Rig {
  readonly name: string;
  readonly port: string;
  readonly baudRate: number;
  /** The one board that the file is for. */
  readonly boardId: number | undefined;
  readonly belt: RigBelt;
  readonly lick: RigLick | undefined;
  readonly inputs: readonly { readonly name: string; readonly line: number }[];
  /** Inputs that are buttons. */
  readonly buttons: readonly RigButton[];
  readonly outputs: readonly RigOutput[];
  readonly water: {
    readonly perSessionNl: number;
    readonly perDayNl: number;
    readonly largestDropNl: number;
  };
  readonly sync: RigSync | undefined;
  /** A wire from an output to an input, by which true latency is measured. */
  readonly loopback: { readonly output: string; readonly input: string } | undefined;
  /** Absolute: where calibrations of this rig are kept. */
  readonly calibrationsFolder: string;
  /** Those that the rig file refers to. */
  readonly calibrations: readonly UsedCalibration[];
  readonly whenFull: 'water goes on' | 'water stops';
  /** Absolute. */
  readonly recordFolder: string;
  readonly rulesFolder: string;
  /** Where a sealed allocation and its key are. */
  readonly blinding?: { readonly allocation: string; readonly key: string };
  /** Where animals, weights and water are kept, for all rigs; nothing is asked of it where unsaid. */
  readonly animalsFolder?: string;
  /** Over the network, viewers may hold the stimulus back (and never let go of it). */
  readonly viewersMayHold: boolean;
  /** What is asked for at each new cell, in the order of the file. */
  readonly cellFields: readonly string[];
  /** Where alarms are sent. */
  readonly notify: RigNotify | undefined;
  /** The file as it was read, for the session folder. */
  readonly path: string;
  readonly text: string;
}

/** One button of a button box, on an input of the board. */
export interface RigButton {
  readonly name: string;
  readonly line: number;
  /** In the rig file's words, such as `hold stimulus` or `ask induce`. */
  readonly does: string;
  readonly pressedHigh: boolean;
  readonly debounceUs: number;
  /** How long a press is that drives or releases a stimulus. */
  readonly longUs: number;
}

/** An HTTP address that is told of alarms. */
export interface RigNotify {
  readonly url: string;
  /** Of this level and graver. */
  readonly from: AlarmLevel;
  /** The body with its `{names}`; the whole message as JSON where nothing is said. */
  readonly body: string | undefined;
  readonly contentType: string;
  readonly mostPerMin: number;
}

/** A calibration in force, as it was read. */
export interface UsedCalibration {
  readonly calibration: Calibration;
  /** With `/`, from the rig file's folder. */
  readonly source: string;
}

export interface RigBelt {
  readonly lengthCm: number;
  readonly toleranceCm: number;
  readonly countsPerCm: number;
  readonly reversed: boolean;
  readonly stillBelowCmPerS: number;
  readonly speedWindowUs: number;
  readonly hysteresisCm: number;
  readonly seam:
    | {
        readonly line: number;
        readonly offsetCm: number;
        readonly warnCm: number;
        readonly stopCm: number;
      }
    | undefined;
}

export interface RigLick {
  readonly line: number;
  readonly lockoutUs: number;
  readonly stuckUs: number;
  readonly artefactUs: number;
}

export interface RigOutput {
  readonly name: string;
  readonly line: number;
  readonly kind: OutputFacts['kind'];
  readonly longestOnUs: number;
  readonly leastGapUs: number;
  readonly leastTravelCm: number;
  readonly perSession: number | undefined;
  readonly duty: OutputFacts['duty'] | undefined;
  readonly idleHigh: boolean;
  readonly finishOnSilence: boolean;
  /** A mark that runs in shams too: a masking light or sound. */
  readonly masking?: boolean;
  readonly evokesPlateau: boolean;
  readonly valve: OutputFacts['valve'] | undefined;
}

export interface RigSync {
  readonly line: number;
  readonly widthUs: number;
  readonly leastGapUs: number;
  readonly mostGapUs: number;
}

/** What the rules language needs to know of a rig. */
export function factsOf(rig: Rig): RigFacts {
  return {
    beltLengthCm: rig.belt.lengthCm,
    beltToleranceCm: rig.belt.toleranceCm,
    countsPerCm: rig.belt.countsPerCm,
    seamMark: rig.belt.seam !== undefined,
    slipAllowedCm: rig.belt.seam?.stopCm ?? 0,
    stillBelowCmPerS: rig.belt.stillBelowCmPerS,
    hysteresisCm: rig.belt.hysteresisCm,
    outputs: rig.outputs.map((output) => ({
      name: output.name,
      index: output.line,
      kind: output.kind,
      longestOnUs: output.longestOnUs,
      leastGapUs: output.leastGapUs,
      evokesPlateau: output.evokesPlateau,
      ...(output.perSession === undefined ? {} : { perSession: output.perSession }),
      ...(output.duty === undefined ? {} : { duty: output.duty }),
      ...(output.valve === undefined ? {} : { valve: output.valve }),
    })),
    inputs: rig.inputs.map((input) => ({ name: input.name, index: input.line })),
  };
}
