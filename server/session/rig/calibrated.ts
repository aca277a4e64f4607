import type { OutputFacts } from '../../rules/facts.js';
import {
  type Calibration,
  type CalibrationKind,
  numberOf,
  readCalibration,
} from './calibration.js';

/** The word by which a rig file says that a valve is still to be measured. */
export const UNMEASURED = 'none';

export type Report = (where: readonly string[], message: string) => void;

/** Numbers that a rig file leaves to stored calibrations; problems are reported where it names them. */
export class Calibrated {
  readonly used: Calibration[] = [];
  readonly #folder: string;
  readonly #report: Report;

  constructor(folder: string, report: Report) {
    this.#folder = folder;
    this.#report = report;
  }

  /** What the belt's calibration says; undefined where the rig file has none or it is bad. */
  belt(name: string | undefined) {
    const where = ['belt', 'calibration'];
    const found = this.#read(where, name, 'belt', 'belt', ['lengthCm', 'countsPerCm']);
    if (found === undefined) return undefined;
    const offsetCm = numberOf(found, 'offsetCm');
    return {
      lengthCm: numberOf(found, 'lengthCm'),
      countsPerCm: numberOf(found, 'countsPerCm'),
      reversed: found.values.direction === 'reversed',
      offsetCm: Number.isNaN(offsetCm) ? 0 : offsetCm,
    };
  }

  valve(output: string, name: string): OutputFacts['valve'] | undefined {
    const where = ['outputs', output, 'calibration'];
    const names = ['deadUs', 'usPerNl', 'leastNl', 'mostNl'];
    const found = this.#read(where, name, 'valve', output, names);
    if (found === undefined) return undefined;
    const [deadUs, usPerNl, leastNl, mostNl] = names.map((one) => numberOf(found, one));
    return { deadUs: deadUs!, usPerNl: usPerNl!, leastNl: leastNl!, mostNl: mostNl! };
  }

  lick(input: string, name: string | undefined) {
    const where = ['inputs', input, 'calibration'];
    const found = this.#read(where, name, 'lick', input, ['lockoutUs', 'stuckUs']);
    if (found === undefined) return undefined;
    return { lockoutUs: numberOf(found, 'lockoutUs'), stuckUs: numberOf(found, 'stuckUs') };
  }

  /** A calibration stands in for these keys: both would say the same thing twice. */
  refuseBoth(where: readonly string[], written: Readonly<Record<string, unknown>>): void {
    for (const [key, value] of Object.entries(written)) {
      if (value === undefined) continue;
      this.#report([...where, key], 'the calibration says this: leave one of the two out');
    }
  }

  #read(
    where: readonly string[],
    name: string | undefined,
    kind: CalibrationKind,
    of: string,
    needed: readonly string[],
  ): Calibration | undefined {
    if (name === undefined) return undefined;
    let calibration: Calibration;
    try {
      calibration = readCalibration(this.#folder, name);
    } catch (error) {
      this.#report(where, (error as Error).message);
      return undefined;
    }
    if (calibration.kind !== kind || calibration.of !== of) {
      const found = `${calibration.kind} of ${calibration.of}`;
      this.#report(where, `\`${name}\` is a ${found}: expected a ${kind} of ${of}`);
      return undefined;
    }
    const lacking = needed.find((one) => !(numberOf(calibration, one) >= 0));
    if (lacking !== undefined) {
      this.#report(where, `\`${name}\` has no number \`${lacking}\``);
      return undefined;
    }
    this.used.push(calibration);
    return calibration;
  }
}
