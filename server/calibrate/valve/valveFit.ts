import { bandAt, type FittedLine, fitLine, mean, sampleSd } from '../statistics/straightLine.js';
import { volumeOfMassUl } from './water.js';

/** One weighing: so many drops of one open time, caught and weighed. */
export interface Weighing {
  /** As the board measured it, per drop, microseconds. */
  readonly openUs: number;
  readonly drops: number;
  /** Mass of the water, mg: full less empty. */
  readonly massMg: number;
}

/** A valve's line as the rig file takes it, and how well it is known. */
export interface ValveFit {
  /** A drop of v nL takes `deadUs + v * usPerNl`. */
  readonly deadUs: number;
  readonly usPerNl: number;
  /** What was measured: nothing outside is ever asked of the valve. */
  readonly leastNl: number;
  readonly mostNl: number;
  readonly deadErrorUs: number;
  readonly usPerNlError: number;
  /** Scatter of the points about the line over the mean volume, %. */
  readonly scatterPercent: number;
  /** Coefficient of variation between weighings of one open time, %; null where none was repeated. */
  readonly repeatPercent: number | null;
  readonly line: FittedLine;
  readonly points: readonly ValvePoint[];
}

export interface ValvePoint extends Weighing {
  readonly dropNl: number;
  /** Off the line, nL. */
  readonly residualNl: number;
  /** Half the width of the line's 95 % confidence band here, nL. */
  readonly bandNl: number;
}

/** Why a valve's measurements make no calibration, in words. */
export class NoLine extends Error {}

/**
 * The line through weighed drops: volume against open time by least squares, since the time is set
 * and the volume measured; then turned round for the rig file.
 * @param celsius the water's temperature
 * @throws NoLine where the points do not make a valve: the message says why
 */
export function fitValve(weighings: readonly Weighing[], celsius: number): ValveFit {
  const times = weighings.map(({ openUs }) => openUs);
  if (new Set(times.map((us) => Math.round(us / 1_000))).size < 3) {
    throw new NoLine('three open times at least are needed for a line with its uncertainty');
  }
  const drops = weighings.map((one) => dropNl(one, celsius));
  if (drops.some((nl) => !(nl > 0))) throw new NoLine('every weighing must show some water');
  const line = fitLine(times, drops);
  if (!(line.slope > 0)) throw new NoLine('longer open times gave no more water');
  const usPerNl = 1 / line.slope;
  const deadUs = -line.offset / line.slope;
  return {
    deadUs: Math.max(0, deadUs),
    usPerNl,
    leastNl: Math.ceil(Math.min(...drops)),
    mostNl: Math.floor(Math.max(...drops)),
    deadErrorUs: deadError(line, deadUs),
    usPerNlError: line.slopeError * usPerNl * usPerNl,
    scatterPercent: (100 * line.residualSd) / mean(drops),
    repeatPercent: repeatPercent(times, drops),
    line,
    points: weighings.map((one, i) => ({
      ...one,
      dropNl: drops[i]!,
      residualNl: line.residuals[i]!,
      bandNl: bandAt(line, one.openUs),
    })),
  };
}

/** Volume of one drop of a weighing, nL. */
export function dropNl({ massMg, drops }: Weighing, celsius: number): number {
  return (1_000 * volumeOfMassUl(massMg, celsius)) / drops;
}

/**
 * Standard error of where the line meets zero volume, to first order (Draper and Smith, section
 * 3.2, inverse regression, without the scatter of a new point).
 */
function deadError(line: FittedLine, deadUs: number): number {
  const n = line.freedom + 2;
  const away = deadUs - line.meanX;
  return (line.residualSd / line.slope) * Math.sqrt(1 / n + (away * away) / line.xx);
}

/** Pooled over the open times that were weighed more than once. */
function repeatPercent(times: readonly number[], drops: readonly number[]): number | null {
  const groups = new Map<number, number[]>();
  times.forEach((us, i) => {
    const key = Math.round(us / 1_000);
    groups.set(key, [...(groups.get(key) ?? []), drops[i]!]);
  });
  let sum = 0;
  let freedom = 0;
  for (const group of groups.values()) {
    if (group.length < 2) continue;
    sum += (sampleSd(group) / mean(group)) ** 2 * (group.length - 1);
    freedom += group.length - 1;
  }
  return freedom === 0 ? null : 100 * Math.sqrt(sum / freedom);
}

/** A valve this far from its calibration needs a new one before the next animal. */
export const ALARM_PERCENT = 10;
/** Half of that is worth a look. */
export const WARN_PERCENT = 5;

export interface ValveCheck {
  readonly expectedNl: number;
  readonly foundNl: number;
  /** Found, less expected, over expected. */
  readonly offPercent: number;
  readonly verdict: 'good' | 'warn' | 'alarm';
}

/** One weighing against the line in force: the weekly check. */
export function checkValve(
  weighing: Weighing,
  celsius: number,
  line: { readonly deadUs: number; readonly usPerNl: number },
): ValveCheck {
  const expectedNl = (weighing.openUs - line.deadUs) / line.usPerNl;
  const foundNl = dropNl(weighing, celsius);
  const offPercent = (100 * (foundNl - expectedNl)) / expectedNl;
  const off = Math.abs(offPercent);
  const verdict = off > ALARM_PERCENT ? 'alarm' : off > WARN_PERCENT ? 'warn' : 'good';
  return { expectedNl, foundNl, offPercent, verdict };
}
