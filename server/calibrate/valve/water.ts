/** Water is weighed at a room's temperature; beyond it something else is wrong. */
export const ROOM_C = { least: 5, most: 40 } as const;

/**
 * Density of water free of air at 101.325 kPa, g/mL.
 *
 * M. Tanaka, G. Girard, R. Davis, A. Peuto and N. Bignell, Recommended table for the density of
 * water between 0 C and 40 C based on recent experimental reports, Metrologia 38 (2001) 301-309,
 * equation 1: the formula that the CIPM recommends.
 * @param celsius 0 to 40
 */
export function waterDensity(celsius: number): number {
  const away = (celsius - 3.983035) ** 2 * (celsius + 301.797);
  return 0.99997495 * (1 - away / (522528.9 * (celsius + 69.34881)));
}

/** Air at 20 C and 101.3 kPa, and the steel that balances are set with, g/mL (OIML D 28). */
const AIR = 0.0012;
const STEEL = 8;

/**
 * Volume of water from what a balance shows, uL. Air carries water more than it does steel, so the
 * balance shows a thousandth too little (ISO 8655-6, the factor Z).
 * @param mg shown by the balance
 */
export function volumeOfMassUl(mg: number, celsius: number): number {
  const density = waterDensity(celsius);
  return (mg / density) * ((1 - AIR / STEEL) / (1 - AIR / density));
}
