import { type Distribution, distribution, logEdges } from '../statistics/distribution.js';

/** What was timed, microseconds each. */
export interface Latencies {
  /** From a command's write to the board's answer, by the computer's clock. */
  readonly roundTripUs: readonly number[];
  /** How much later than the promptest each frame was taken, by the computer's clock. */
  readonly frameLateUs: readonly number[];
  /** With a wire from output to input: from the rise that the board reports to the edge it sees. */
  readonly outputUs: readonly number[];
}

export interface LatencyFit {
  readonly roundTripUs: Distribution;
  readonly frameLateUs: Distribution;
  /** null without a loopback wire. */
  readonly outputUs: Distribution | null;
  /** Frames taken so late that armed slots end (150 ms). */
  readonly stalls: number;
}

const STALL_US = 150_000;
const EDGES = logEdges(10, 1_000_000, 4);
/** A board's own output and input lie microseconds apart. */
const OUTPUT_EDGES = logEdges(1, 10_000, 4);

/** The distributions of what was timed. */
export function fitLatencies({ roundTripUs, frameLateUs, outputUs }: Latencies): LatencyFit {
  return {
    roundTripUs: distribution(roundTripUs, EDGES),
    frameLateUs: distribution(frameLateUs, EDGES),
    outputUs: outputUs.length === 0 ? null : distribution(outputUs, OUTPUT_EDGES),
    stalls: frameLateUs.filter((us) => us >= STALL_US).length,
  };
}

/**
 * How much later than the promptest each frame came: host time less board time, less the least of
 * that. The two clocks drift apart by tens of parts in a million, so the least is taken over
 * stretches.
 */
export function latenessUs(
  frames: readonly { readonly boardUs: number; readonly hostUs: number }[],
  stretch = 1_000,
): number[] {
  const late: number[] = [];
  for (let at = 0; at < frames.length; at += stretch) {
    const some = frames.slice(at, at + stretch).map(({ boardUs, hostUs }) => hostUs - boardUs);
    const least = some.reduce((a, b) => Math.min(a, b), Number.POSITIVE_INFINITY);
    for (const one of some) late.push(one - least);
  }
  return late;
}
