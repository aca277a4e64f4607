/**
 * P(|T| < t) of Student's distribution with whole degrees of freedom, by its finite sums.
 *
 * M. Abramowitz and I. A. Stegun, Handbook of Mathematical Functions, 26.7.3 (odd) and 26.7.4 (even).
 */
export function studentWithin(t: number, freedom: number): number {
  const angle = Math.atan(t / Math.sqrt(freedom));
  const sine = Math.sin(angle);
  const cosine = Math.cos(angle);
  const odd = freedom % 2 === 1;
  let term = odd ? cosine : 1;
  let sum = freedom === 1 ? 0 : term;
  for (let k = odd ? 3 : 2; k < freedom; k += 2) {
    term *= ((k - 1) / k) * cosine * cosine;
    sum += term;
  }
  return odd ? (2 / Math.PI) * (angle + sine * sum) : sine * sum;
}

/**
 * The t that a Student's variable stays within, on either side of 0, with probability `level`.
 * @param freedom degrees of freedom, a whole number from 1
 * @returns NaN where there is no freedom left: nothing can be said
 */
export function studentT(level: number, freedom: number): number {
  if (!(Number.isInteger(freedom) && freedom >= 1)) return Number.NaN;
  let low = 0;
  let high = 1;
  while (studentWithin(high, freedom) < level) high *= 2;
  // Bisection down to the last bit: it is asked a few times in a calibration.
  for (let step = 0; step < 100; step++) {
    const middle = (low + high) / 2;
    if (studentWithin(middle, freedom) < level) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}
