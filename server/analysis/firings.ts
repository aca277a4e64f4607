import type { StampedDecision } from '../session/decisions.js';
import { type OnSpan, onSpans } from './pulses.js';
import type { SessionData } from './readSession.js';
import { slipSpans } from './slips.js';

type Of<K extends StampedDecision['kind']> = Extract<StampedDecision, { kind: K }>;

/** One output's part in a firing, or a sham: where it was meant to be, and where it was. */
export interface Firing {
  readonly input: number;
  readonly rule: string;
  readonly serial: number;
  readonly sham: boolean;
  /** Started by the board's own slot, or decided in the host. */
  readonly armed: boolean;
  readonly output: string | null;
  readonly lap: number;
  /** When the rules decided (or the slot was armed), and the first rise. */
  readonly decidedUs: number;
  readonly boardUs: number;
  /** Microseconds on, all pulses of it; null where the board never said. */
  readonly onUs: number | null;
  /** Each pulse of it; none for a sham, or where the board never said. */
  readonly spans: readonly OnSpan[];
  /** Rise after the decision; null for an armed one, which the board starts at the place. */
  readonly latencyUs: number | null;
  readonly speedCmPerS: number;
  /** The place intended; where the rise was by the counts of that moment; the distance. */
  readonly placeCm: number | null;
  readonly riseCm: number | null;
  readonly errorMm: number | null;
  /** `riseCm` after the lap's slip, found at the next mark, is shared out evenly over the lap. */
  readonly correctedCm: number | null;
  /** Half widths. As decided: by this session's slips so far unseen. Corrected: by this lap's own. */
  readonly decidedUncertaintyMm: number | null;
  readonly correctedUncertaintyMm: number | null;
}

/** Every firing and sham of the session, in order of its decision. */
export function firingsOf(session: SessionData): Firing[] {
  const { decisions, rig, shapes } = session;
  const { lengthCm } = rig.belt;
  const spans = slipSpans(decisions, lengthCm);
  const typicalMm = rms(spans.map(({ slipMm }) => slipMm));
  const markCm = spans[0]?.markCm ?? 0;
  const halfCountMm = 5 / rig.belt.countsPerCm;
  const asked = new Map<string, { readonly boardUs: number; readonly ids: readonly number[] }>();
  const fallOf = falls(decisions);
  const firings: Firing[] = [];
  for (const d of decisions) {
    if (d.kind === 'asked' || d.kind === 'armed') asked.set(`${d.rule} ${d.serial}`, d);
    if (d.kind !== 'fired') continue;
    const boardUs = d.riseUs ?? d.boardUs;
    const order = asked.get(`${d.rule} ${d.serial}`);
    const decidedUs = order?.boardUs ?? d.boardUs;
    const onUs = fallOf.get(d)?.onUs ?? null;
    const shape = order?.ids.map((id) => shapes.get(id)).find((s) => s?.output === d.output);
    const riseCm = d.riseCm ?? (d.sham ? d.positionCm : null);
    const span = spans.find(({ fromUs, toUs }) => boardUs >= fromUs && boardUs < toUs);
    // How far round the belt since the mark: slip is taken to gather evenly on the way.
    const share = riseCm === null ? null : ((riseCm - markCm + 2 * lengthCm) % lengthCm) / lengthCm;
    const slipMm = span?.slipMm;
    const real =
      share === null || slipMm === undefined
        ? null
        : (riseCm! - (slipMm / 10) * share + lengthCm) % lengthCm;
    firings.push({
      ...{ input: d.input, rule: d.rule, serial: d.serial, sham: d.sham, armed: d.armed },
      ...{ output: d.output, lap: d.lap, decidedUs, boardUs },
      ...{ onUs, spans: onUs === null ? [] : onSpans(boardUs, onUs, shape) },
      latencyUs: d.armed || d.riseUs === null ? null : d.riseUs - decidedUs,
      speedCmPerS: d.speedCmPerS,
      ...{ placeCm: d.placeCm, riseCm, errorMm: d.errorMm, correctedCm: real },
      decidedUncertaintyMm:
        share === null || typicalMm === null ? null : halfCountMm + typicalMm * share,
      correctedUncertaintyMm:
        share === null || slipMm === undefined
          ? null
          : halfCountMm + Math.abs(slipMm) * Math.max(share, 1 - share),
    });
  }
  return firings;
}

/** For each rise the fall that belongs to it: the next of its rule on its output, before another rise. */
function falls(decisions: readonly StampedDecision[]): Map<StampedDecision, Of<'pulse done'>> {
  const found = new Map<StampedDecision, Of<'pulse done'>>();
  const open = new Map<string, Of<'fired'>>();
  for (const d of decisions) {
    if (d.kind === 'fired' && d.output !== null) open.set(d.output, d);
    if (d.kind !== 'pulse done') continue;
    const fired = open.get(d.output);
    if (fired?.rule !== d.rule) continue;
    found.set(fired, d);
    open.delete(d.output);
  }
  return found;
}

function rms(values: readonly number[]): number | null {
  if (values.length === 0) return null;
  return Math.sqrt(values.reduce((sum, value) => sum + value * value, 0) / values.length);
}
