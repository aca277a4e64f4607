import { BASE_UNIT, type Dimension } from '../ast.js';

/** Powers of length, time and volume: what the units of an amount come to. */
export interface Powers {
  readonly length: number;
  readonly time: number;
  readonly volume: number;
}

const POWERS: Readonly<Record<Dimension, Powers>> = {
  number: { length: 0, time: 0, volume: 0 },
  length: { length: 1, time: 0, volume: 0 },
  time: { length: 0, time: 1, volume: 0 },
  speed: { length: 1, time: -1, volume: 0 },
  volume: { length: 0, time: 0, volume: 1 },
  rate: { length: 0, time: -1, volume: 0 },
};

export function powersOf(dimension: Dimension): Powers {
  return POWERS[dimension];
}

export function samePowers(a: Powers, b: Powers): boolean {
  return a.length === b.length && a.time === b.time && a.volume === b.volume;
}

export function multiply(a: Powers, b: Powers, sign: 1 | -1): Powers {
  return {
    length: a.length + sign * b.length,
    time: a.time + sign * b.time,
    volume: a.volume + sign * b.volume,
  };
}

/**
 * Base units are microseconds for a time but seconds below the line (cm/s, Hz), so that products
 * and quotients need a factor: 30 cm / 2 s is 30 / 2,000,000 in base numbers and 15 cm/s.
 * @returns what the base numbers' product or quotient must be multiplied by
 */
export function baseFactor(a: Powers, b: Powers, sign: 1 | -1): number {
  const seconds = (powers: Powers): number => Math.max(0, -powers.time);
  const result = multiply(a, b, sign);
  // Exponents of 1e6 by which each base number exceeds one reckoned in microseconds throughout.
  return 1e6 ** (seconds(result) - seconds(a) - sign * seconds(b));
}

/** In words: `a length`, or the units for what has no name. */
export function nameOf(powers: Powers): string {
  for (const [name, known] of Object.entries(POWERS)) {
    if (samePowers(known, powers)) return name === 'number' ? 'a plain number' : `a ${name}`;
  }
  const part = (unit: string, power: number): string =>
    power === 0 ? '' : power === 1 ? unit : `${unit}^${power}`;
  const units = [
    part('cm', powers.length),
    part('s', powers.time),
    part(BASE_UNIT.volume, powers.volume),
  ];
  return `an amount in ${units.filter((unit) => unit !== '').join(' ')}`;
}

export function dimensionOf(powers: Powers): Dimension | undefined {
  const found = Object.entries(POWERS).find(([, known]) => samePowers(known, powers));
  return found?.[0] as Dimension | undefined;
}
