/** A train of pulses as it was commanded; a single pulse is a train of one. */
export interface PulseShape {
  /** The output's name. */
  readonly output: string;
  readonly widthUs: number;
  /** Rise to rise. */
  readonly periodUs: number;
  readonly repeats: number;
}
/** From a rise to its fall, board time in microseconds. */
export interface OnSpan {
  readonly fromUs: number;
  readonly toUs: number;
}

/** A board may time a pulse this much longer than it was told: its interrupts wait for each other. */
const LONG_US = 50;

/**
 * When an output was on: the board's first rise and its total time on, shared out over the train that
 * was commanded. A train that ended early lacks its last pulses, and the last it has is cut.
 * @param shape undefined where no command of the record was found: then one pulse
 */
export function onSpans(riseUs: number, onUs: number, shape: PulseShape | undefined): OnSpan[] {
  if (shape === undefined || shape.repeats < 2)
    return onUs > 0 ? [{ fromUs: riseUs, toUs: riseUs + onUs }] : [];
  const { widthUs, periodUs, repeats } = shape;
  const full = Math.floor(onUs / widthUs);
  const rest = onUs - full * widthUs;
  const cut = full < repeats && rest > full * LONG_US;
  const count = cut ? full + 1 : Math.min(full, repeats);
  const eachUs = cut ? widthUs : Math.floor(onUs / count);
  return Array.from({ length: count }, (_, k) => {
    const fromUs = riseUs + k * periodUs;
    return { fromUs, toUs: fromUs + (k === count - 1 ? onUs - k * eachUs : eachUs) };
  });
}
