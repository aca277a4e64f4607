import type { OutputFacts, RigFacts } from '../../rules/facts.js';

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
  readonly outputs: readonly RigOutput[];
  readonly water: {
    readonly perSessionNl: number;
    readonly perDayNl: number;
    readonly largestDropNl: number;
  };
  readonly sync: RigSync | undefined;
  readonly whenFull: 'water goes on' | 'water stops';
  /** Absolute. */
  readonly recordFolder: string;
  readonly rulesFolder: string;
  /** Where animals, weights and water are kept, for all rigs; nothing is asked of it where unsaid. */
  readonly animalsFolder?: string;
  /** Over the network, viewers may hold the stimulus back (and never let go of it). */
  readonly viewersMayHold: boolean;
  /** The file as it was read, for the session folder. */
  readonly path: string;
  readonly text: string;
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
      ...(output.perSession === undefined ? {} : { perSession: output.perSession }),
      ...(output.duty === undefined ? {} : { duty: output.duty }),
      ...(output.valve === undefined ? {} : { valve: output.valve }),
    })),
    inputs: rig.inputs.map((input) => ({ name: input.name, index: input.line })),
  };
}
