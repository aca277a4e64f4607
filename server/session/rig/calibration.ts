import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { Ajv2020 } from 'ajv/dist/2020.js';
import { LapwingError } from '../../errors/codes.js';
import { packageRoot } from '../../packageRoot.js';

export type CalibrationKind = 'belt' | 'valve' | 'valve check' | 'lick' | 'latency';

/** `NAME.json` in the rig's calibrations folder; each field is explained in `calibration.schema.json`. */
export interface Calibration {
  readonly format: 1;
  /** The file's name without `.json`: what the rig file refers to. */
  readonly name: string;
  readonly kind: CalibrationKind;
  /** `belt`, or the name of the output or input in the rig file. */
  readonly of: string;
  readonly rig: string;
  /** RFC 3339. */
  readonly madeAt: string;
  readonly by: string;
  readonly board: { readonly model: string; readonly boardId: number; readonly simulated: boolean };
  /** Older than this it is still used, and warned of. */
  readonly warnAfterDays: number;
  /** What it says, by name, with the unit in the name. */
  readonly values: Readonly<Record<string, number | string>>;
  /** Standard uncertainty of those values that have one. */
  readonly uncertainty: Readonly<Record<string, number>>;
  /** In words: what it was made from. */
  readonly method: string;
  /** What was measured, so that it can be reckoned again. */
  readonly measured: unknown;
}

/** A name that a rig file may refer to, and so a file's. */
export const CALIBRATION_NAME = /^[A-Za-z0-9][A-Za-z0-9_.-]{0,79}$/;

const validate = new Ajv2020({ allowUnionTypes: true }).compile(
  JSON.parse(readFileSync(join(packageRoot, 'server/session/rig/calibration.schema.json'), 'utf8')),
);

/**
 * Reads one calibration.
 * @throws LapwingError CALIBRATION_BAD with the file, and what was expected where
 */
export function readCalibration(folder: string, name: string): Calibration {
  const file = join(folder, `${name}.json`);
  let value: unknown;
  try {
    if (!CALIBRATION_NAME.test(name)) throw new Error('that is no name of a calibration');
    value = JSON.parse(readFileSync(file, 'utf8'));
  } catch (error) {
    throw new LapwingError('calibrationBad', `${file}: ${(error as Error).message}`, {
      cause: error,
    });
  }
  if (!validate(value)) {
    const [first] = validate.errors ?? [];
    const where = first?.instancePath || 'the file';
    throw new LapwingError('calibrationBad', `${file}: ${where} ${first?.message ?? 'is wrong'}`);
  }
  const calibration = value as unknown as Calibration;
  if (calibration.name !== name) {
    throw new LapwingError('calibrationBad', `${file}: it calls itself \`${calibration.name}\``);
  }
  return calibration;
}

/** Every calibration in a folder, the newest first; files that are none are told apart. */
export function listCalibrations(folder: string): {
  readonly calibrations: readonly Calibration[];
  readonly bad: readonly { readonly file: string; readonly why: string }[];
} {
  const calibrations: Calibration[] = [];
  const bad: { file: string; why: string }[] = [];
  let names: string[] = [];
  try {
    names = readdirSync(folder).filter((name) => name.endsWith('.json'));
  } catch {
    // Nothing has been calibrated yet.
  }
  for (const file of names) {
    try {
      calibrations.push(readCalibration(folder, file.slice(0, -5)));
    } catch (error) {
      bad.push({ file, why: (error as Error).message });
    }
  }
  calibrations.sort((a, b) => Date.parse(b.madeAt) - Date.parse(a.madeAt));
  return { calibrations, bad };
}

const DAY_MS = 86_400_000;

/** Days since it was made; a fraction. */
export function ageDays({ madeAt }: Pick<Calibration, 'madeAt'>, now: Date): number {
  return (now.getTime() - Date.parse(madeAt)) / DAY_MS;
}

/** Whether a calibration is so old that it is to be made anew. */
export function isOld(calibration: Calibration, now: Date): boolean {
  return ageDays(calibration, now) > calibration.warnAfterDays;
}

/** A number of a calibration that a rig cannot do without; NaN where it has none. */
export function numberOf({ values }: Calibration, name: string): number {
  const value = values[name];
  return typeof value === 'number' ? value : Number.NaN;
}
