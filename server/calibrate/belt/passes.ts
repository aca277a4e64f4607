/** A change of the seam sensor as the board stamped it. */
export interface MarkEdge {
  /** Encoder count, not wrapped. */
  readonly count: number;
  readonly level: 0 | 1;
}

/** The mark went by the sensor, from one of its ends to the other. */
export interface Pass {
  /** Counts at which it was first and last seen. */
  readonly fromCount: number;
  readonly toCount: number;
}

/**
 * Passes of the mark from the sensor's edges. Contacts shorter than `chatterCounts` are an edge that
 * bounces, or a mark entered and left by the same end: they lengthen the pass they lie next to, and
 * are none of their own.
 */
export function passesOf(edges: readonly MarkEdge[], chatterCounts: number): Pass[] {
  const passes: { fromCount: number; toCount: number }[] = [];
  const near = (a: number, b: number) => Math.abs(a - b) < chatterCounts;
  let blip: { fromCount: number; toCount: number } | undefined;
  for (const { fromCount, toCount } of contactsOf(edges)) {
    const last = passes.at(-1);
    if (near(fromCount, toCount)) {
      if (last !== undefined && near(last.toCount, fromCount)) last.toCount = toCount;
      else if (blip !== undefined && near(blip.toCount, fromCount)) blip.toCount = toCount;
      else blip = { fromCount, toCount };
      continue;
    }
    const begins = blip !== undefined && near(blip.toCount, fromCount) ? blip.fromCount : fromCount;
    blip = undefined;
    const ahead = (pass: Pass) => pass.toCount > pass.fromCount;
    const goesOn =
      last !== undefined &&
      near(last.toCount, begins) &&
      ahead(last) === ahead({ fromCount, toCount });
    if (goesOn) last.toCount = toCount;
    else passes.push({ fromCount: begins, toCount });
  }
  return passes;
}

/** From each rise to the fall that follows it. */
function contactsOf(edges: readonly MarkEdge[]): Pass[] {
  const contacts: Pass[] = [];
  let fromCount: number | undefined;
  for (const { count, level } of edges) {
    if (level === 1) {
      fromCount ??= count;
    } else if (fromCount !== undefined) {
      contacts.push({ fromCount, toCount: count });
      fromCount = undefined;
    }
  }
  return contacts;
}
