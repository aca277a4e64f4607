/**
 * The window of synaptic plasticity about the onset of a dendritic plateau, and the tuning of the
 * inputs that it acts on. Inputs that were active up to some seconds before or after the onset are
 * strengthened, the less the further away; the window is longer before the onset than after it.
 *
 * Time constants: about 1.3 s before and 0.7 s after (from memory of a publication). Made with
 * multiplication alone, so that every machine reckons the same.
 */

/** Time constants of the window's two sides. */
export const BEFORE_TAU_S = 1.31;
export const AFTER_TAU_S = 0.69;
/** How far from the onset the belt's occupancy is taken. */
export const BEFORE_US = 3_000_000;
export const AFTER_US = 1_000_000;
/** The window is summed in steps of this length. */
export const STEP_US = 10_000;

/**
 * Standard deviation of the place tuning of one input. The strengthened inputs are read out by
 * that same tuning, so it enters a prediction twice (common practice, no source).
 */
export const INPUT_TUNING_CM = 15;
/** A field's width is taken where it falls to this share of its peak (common practice, no source). */
export const EDGE_SHARE = 0.2;

/** `exp(-x)` for 0 <= x <= 1 by its Taylor series; the engine has no transcendental functions. */
export function smallDecay(x: number): number {
  let term = 1;
  let sum = 1;
  for (let n = 1; n <= 18; n++) {
    term = (-term * x) / n;
    sum += term;
  }
  return sum;
}

/**
 * The window's weight in each step from `-BEFORE_US` to `AFTER_US`: 1 at the onset. Each is the
 * weight at the middle of its step.
 */
export function kernelSteps(): Float64Array {
  const before = BEFORE_US / STEP_US;
  const after = AFTER_US / STEP_US;
  const weights = new Float64Array(before + after);
  fillSide(weights, before - 1, -1, before, STEP_US / 1e6 / BEFORE_TAU_S);
  fillSide(weights, before, 1, after, STEP_US / 1e6 / AFTER_TAU_S);
  return weights;
}

function fillSide(weights: Float64Array, from: number, by: number, count: number, step: number) {
  const decay = smallDecay(step);
  let weight = smallDecay(step / 2);
  for (let n = 0; n < count; n++) {
    weights[from + n * by] = weight;
    weight *= decay;
  }
}

/**
 * One side of a Gaussian in steps of `stepCm`, from its middle out to four standard deviations, so
 * scaled that the whole of it sums to 1.
 */
export function gaussianSteps(sdCm: number, stepCm: number): Float64Array {
  const size = Math.floor((4 * sdCm) / stepCm) + 1;
  const weights = new Float64Array(size);
  // exp(-(n h)^2 / (2 sd^2)): each is the one before times q^(2n + 1).
  const q = smallDecay((stepCm * stepCm) / (2 * sdCm * sdCm));
  let weight = 1;
  let ratio = q;
  let sum = 0;
  for (let n = 0; n < size; n++) {
    weights[n] = weight;
    sum += n === 0 ? weight : 2 * weight;
    weight *= ratio;
    ratio *= q * q;
  }
  for (let n = 0; n < size; n++) weights[n] = weights[n]! / sum;
  return weights;
}
