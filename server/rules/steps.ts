/** Decimal steps are not exact in binary: a value counts as on a step this near to it. */
const SLACK = 1e-6;

/** Whether a value is a whole number of steps above the lower bound. */
export function isOnStep(value: number, from: number, step: number): boolean {
  const steps = (value - from) / step;
  const off = steps - Math.floor(steps + 0.5);
  return off < SLACK && off > -SLACK;
}
