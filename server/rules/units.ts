import { BASE_UNIT, type Dimension } from './ast.js';

/** The units of both files (rules and rig), each with its dimension and its size in base units. */
export const UNITS: Readonly<
  Record<string, { readonly dimension: Dimension; readonly size: number }>
> = Object.assign(Object.create(null), {
  mm: { dimension: 'length', size: 0.1 },
  cm: { dimension: 'length', size: 1 },
  m: { dimension: 'length', size: 100 },
  us: { dimension: 'time', size: 1 },
  ms: { dimension: 'time', size: 1_000 },
  s: { dimension: 'time', size: 1_000_000 },
  min: { dimension: 'time', size: 60_000_000 },
  h: { dimension: 'time', size: 3_600_000_000 },
  'mm/s': { dimension: 'speed', size: 0.1 },
  'cm/s': { dimension: 'speed', size: 1 },
  'm/s': { dimension: 'speed', size: 100 },
  nL: { dimension: 'volume', size: 1 },
  uL: { dimension: 'volume', size: 1_000 },
  mL: { dimension: 'volume', size: 1_000_000 },
  Hz: { dimension: 'rate', size: 1 },
  kHz: { dimension: 'rate', size: 1_000 },
  '%': { dimension: 'number', size: 0.01 },
});

/** Reads a micro sign or a no-break space the way people type them: `µL` is `uL`. */
export function plainText(text: string): string {
  return text
    .replace(/[µμ]/g, 'u')
    .replace(/≤/g, '<=')
    .replace(/≥/g, '>=')
    .replace(/[\u00a0\u202f]/g, ' ');
}

/**
 * A whole text that is one amount, such as `180 cm`, in base units of the wanted dimension.
 * @returns undefined when it is not a number with a unit of that dimension
 */
export function parseQuantity(text: string, dimension: Dimension): number | undefined {
  const match = /^\s*(-?\d+(?:\.\d+)?)\s*([a-zA-Z%/]*)\s*$/.exec(plainText(text));
  if (!match) return undefined;
  const value = Number(match[1]);
  if (match[2] === '') return dimension === 'number' ? value : undefined;
  const unit = UNITS[match[2]!];
  return unit?.dimension === dimension ? scale(value, unit.size) : undefined;
}

/** Prints an amount in base units with a unit that reads well: `4 uL`, `300 ms`, `1.5 s`. */
export function formatQuantity(value: number, dimension: Dimension): string {
  if (dimension === 'number') return String(round(value));
  const units = Object.entries(UNITS).filter(([, unit]) => unit.dimension === dimension);
  let best: [string, number] = [BASE_UNIT[dimension], 1];
  // Lengths and speeds stay in cm and cm/s, as the trade writes them.
  if (dimension !== 'length' && dimension !== 'speed') {
    for (const [name, unit] of units) {
      if (Math.abs(value) >= unit.size && unit.size >= best[1]) best = [name, unit.size];
    }
  }
  return `${round(value / best[1])} ${best[0]}`;
}

/** value * size without the binary residue of sizes below one: 5 mm is exactly 0.5 cm. */
export function scale(value: number, size: number): number {
  return size < 1 ? value / Math.round(1 / size) : value * size;
}

function round(value: number): number {
  return Math.round(value * 1_000) / 1_000;
}
