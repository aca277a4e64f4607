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

/**
 * When an output was on: the board's first rise and its total time on, shared out over the train that
 * was commanded. A train that ended early lacks its last pulses, and the last it has is cut.
 * @param shape undefined where no command of the record was found: then one pulse
 */
export function onSpans(riseUs: number, onUs: number, shape: PulseShape | undefined): OnSpan[] {
  if (shape === undefined || shape.repeats < 2)
    return onUs > 0 ? [{ fromUs: riseUs, toUs: riseUs + onUs }] : [];
  const spans: OnSpan[] = [];
  let left = onUs;
  for (let k = 0; k < shape.repeats && left > 0; k++) {
    const fromUs = riseUs + k * shape.periodUs;
    // The board times each pulse a little long: what is over is the last one's.
    const last = k === shape.repeats - 1;
    const width = last ? left : Math.min(left, shape.widthUs);
    spans.push({ fromUs, toUs: fromUs + width });
    left -= width;
  }
  return spans;
}
