import { ageDays, type Calibration, isOld } from '../../session/rig/calibration.js';
import type { Rig } from '../../session/rig/rig.js';
import type { CalibrationRow } from './rigMessages.js';

/** A calibration as the page lists it: without what was measured, which may be long. */
export function rowOf(calibration: Calibration, rig: Rig, now: Date): CalibrationRow {
  const { measured: _, ...rest } = calibration;
  const { name } = calibration;
  return {
    ...rest,
    inForce: rig.calibrations.some((used) => used.calibration.name === name),
    ageDays: ageDays(calibration, now),
    old: isOld(calibration, now),
  };
}
