/** The x axis that the belt, the laps and the profile share. */
export const LEFT_PX = 46;
export const RIGHT_PX = 14;

/** Pixels from the left for a place on the belt. */
export function xOf(cm: number, lengthCm: number, width: number): number {
  return LEFT_PX + (cm / lengthCm) * (width - LEFT_PX - RIGHT_PX);
}

/** Steps of 1, 2 or 5 times a power of ten, at most `most` of them over `length`. */
export function tickStep(length: number, most: number): number {
  const rough = length / Math.max(1, most);
  const power = 10 ** Math.floor(Math.log10(rough));
  for (const times of [1, 2, 5]) if (power * times >= rough) return power * times;
  return power * 10;
}
