/**
 * The known name that comes nearest to `wanted`, if it is near enough to be what was meant: a third
 * of its letters wrong at most. Letter case alone counts half an edit.
 */
export function nearestName(wanted: string, known: readonly string[]): string | undefined {
  if (wanted.length > 64) return undefined;
  let best: string | undefined;
  let fewest = Math.max(1, Math.floor(wanted.length / 3)) + 0.25;
  for (const name of known) {
    if (name === wanted || Math.abs(name.length - wanted.length) > fewest) continue;
    const edits = name.toLowerCase() === wanted.toLowerCase() ? 0.5 : editsBetween(wanted, name);
    if (edits < fewest) {
      fewest = edits;
      best = name;
    }
  }
  return best;
}

/**
 * The least number of letters to put in, take out, replace or swap with their neighbour that makes
 * `a` into `b` (F. J. Damerau, Communications of the ACM 7(3), 1964; the restricted form).
 */
export function editsBetween(a: string, b: string): number {
  let before: number[] = [];
  let above = Array.from({ length: b.length + 1 }, (_, column) => column);
  for (let row = 1; row <= a.length; row++) {
    const here = [row];
    for (let column = 1; column <= b.length; column++) {
      const same = a[row - 1] === b[column - 1];
      let least = Math.min(
        above[column - 1]! + (same ? 0 : 1),
        above[column]! + 1,
        here[column - 1]! + 1,
      );
      const swapped =
        row > 1 && column > 1 && a[row - 1] === b[column - 2] && a[row - 2] === b[column - 1];
      if (swapped) least = Math.min(least, before[column - 2]! + 1);
      here.push(least);
    }
    before = above;
    above = here;
  }
  return above[b.length]!;
}
