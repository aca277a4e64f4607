import { LapwingError } from '../errors/codes.js';
import type { Firing } from './firings.js';
import type { EdgeSeen, SessionData } from './readSession.js';

/** An output that is wired back to an input, to measure when it really rose. */
export interface Loopback {
  readonly output: string;
  readonly input: string;
}
/** A firing's first rise as the input saw it. */
export interface SeenBack {
  /** After the rise that the board reported. */
  readonly laterUs: number;
  /** By the encoder's count at the edge; null while position was unknown. */
  readonly placeCm: number | null;
  /** Less the place intended. */
  readonly errorMm: number | null;
}
export interface MeasuredBack {
  /** Each firing of the output; null where no rise was seen. */
  readonly firings: ReadonlyMap<Firing, SeenBack | null>;
  /** Rises that no pulse of any firing explains. */
  readonly unexplained: readonly EdgeSeen[];
}

/** A rise is looked for from just before the board's own stamp until this long after it. */
const EARLY_US = 1_000;
const LATE_US = 50_000;

/**
 * Measures the firings of an output by the input that it is wired back to.
 * @throws LapwingError REPORT_LOOPBACK where the rig has no such output or input
 */
export function measureBack(
  session: SessionData,
  firings: readonly Firing[],
  { output, input }: Loopback,
): MeasuredBack {
  const { rig, edges } = session;
  const names = (list: readonly { readonly name: string }[]) => list.map(({ name }) => name);
  if (!names(rig.outputs).includes(output) || !names(rig.inputs).includes(input))
    throw new LapwingError(
      'reportLoopback',
      `--loopback ${output}=${input}: outputs are ${names(rig.outputs).join(', ')}; ` +
        `inputs ${names(rig.inputs).join(', ')}.`,
    );
  const rises = edges.filter((edge) => edge.name === input && edge.level === 1);
  const explained = new Set<EdgeSeen>();
  const found = new Map<Firing, SeenBack | null>();
  let from = 0;
  for (const firing of firings.filter((f) => f.output === output && !f.sham)) {
    const pulses = firing.spans.map(({ fromUs }) => fromUs);
    let first: EdgeSeen | undefined;
    for (const fromUs of pulses.length === 0 ? [firing.boardUs] : pulses) {
      while (from < rises.length && rises[from]!.boardUs < fromUs - EARLY_US) from++;
      const rise = rises[from];
      if (rise === undefined || rise.boardUs >= fromUs + LATE_US) continue;
      explained.add(rise);
      from++;
      if (fromUs === firing.boardUs) first = rise;
    }
    found.set(firing, first === undefined ? null : seen(session, firing, first));
  }
  return { firings: found, unexplained: rises.filter((rise) => !explained.has(rise)) };
}

function seen(session: SessionData, firing: Firing, rise: EdgeSeen): SeenBack {
  const { lengthCm } = session.rig.belt;
  const placeCm = placeAt(session, rise);
  const intended = firing.placeCm;
  const awayCm = placeCm === null || intended === null ? null : placeCm - intended;
  return {
    laterUs: rise.boardUs - firing.boardUs,
    placeCm,
    // The short way round the belt.
    errorMm: awayCm === null ? null : 10 * (awayCm - lengthCm * Math.round(awayCm / lengthCm)),
  };
}

/** Where the belt was at an edge: the place of the next sample, less the counts in between. */
function placeAt({ samples: s, rig }: SessionData, edge: EdgeSeen): number | null {
  const at = Math.min(s.indexAt(edge.boardUs), s.length - 1);
  if (at < 0 || Number.isNaN(s.positionCm[at]!)) return null;
  const { lengthCm, countsPerCm, reversed } = rig.belt;
  const counts = (edge.count - s.count[at]!) * (reversed ? -1 : 1);
  const cm = s.positionCm[at]! + counts / countsPerCm;
  return ((cm % lengthCm) + lengthCm) % lengthCm;
}
