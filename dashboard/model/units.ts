/** Base units of the rules engine as people write them: 3000 nL is 3 µL, 5000 us is 5 ms. */
export interface ShownUnit {
  readonly word: string;
  /** How many base units one of the shown ones is. */
  readonly factor: number;
}

const SHOWN: Readonly<Record<string, ShownUnit>> = {
  nL: { word: 'µL', factor: 1000 },
  us: { word: 'ms', factor: 1000 },
};

export function shownUnit(unit: string): ShownUnit {
  return SHOWN[unit] ?? { word: unit, factor: 1 };
}

/** A value in base units as it is shown; words stay words. Decimals that only rounding made go. */
export function shown(value: number | string, unit: string): number | string {
  if (typeof value === 'string') return value;
  return Number((value / shownUnit(unit).factor).toPrecision(10));
}
