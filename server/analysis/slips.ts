import type { StampedDecision } from '../session/decisions.js';

/** From one accepted mark to the next: the belt went round once, and slipped by so much. */
export interface SlipSpan {
  readonly fromUs: number;
  readonly toUs: number;
  /** The encoder's place less the mark's as it was met. */
  readonly slipMm: number;
  /** Where on the belt the mark is met, cm. */
  readonly markCm: number;
  /** The lap that most of it lies in. */
  readonly lap: number;
}

/** Every turn of the belt whose slip is known; one with a missed or ignored mark is not. */
export function slipSpans(
  decisions: readonly StampedDecision[],
  beltLengthCm: number,
): readonly SlipSpan[] {
  const spans: SlipSpan[] = [];
  let fromUs: number | undefined;
  for (const d of decisions) {
    if (d.kind !== 'seam') continue;
    const { event, slipMm, boardUs, positionCm, lap } = d;
    if (event === 'accepted' && slipMm !== null && fromUs !== undefined && positionCm !== null) {
      // Told once the position is corrected: it is the mark's own.
      const ended = positionCm < beltLengthCm / 2;
      spans.push({ fromUs, toUs: boardUs, slipMm, markCm: positionCm, lap: ended ? lap - 1 : lap });
    }
    fromUs = event === 'missed' || event === 'ignored' ? undefined : boardUs;
  }
  return spans;
}
