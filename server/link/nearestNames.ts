/**
 * The candidates nearest to `wanted` by edits (V. Levenshtein, Soviet Physics Doklady, 1966),
 * nearest first.
 */
export function nearestNames(wanted: string, candidates: readonly string[], most = 4): string[] {
  return candidates
    .map((name) => ({ name, edits: editsBetween(wanted, name) }))
    .sort((a, b) => a.edits - b.edits)
    .slice(0, most)
    .map(({ name }) => name);
}

/** The least number of letters to put in, take out or replace that makes `a` into `b`. */
export function editsBetween(a: string, b: string): number {
  let above = Array.from({ length: b.length + 1 }, (_, column) => column);
  for (let row = 1; row <= a.length; row++) {
    const here = [row];
    for (let column = 1; column <= b.length; column++) {
      const replaced = above[column - 1]! + (a[row - 1] === b[column - 1] ? 0 : 1);
      here.push(Math.min(replaced, above[column]! + 1, here[column - 1]! + 1));
    }
    above = here;
  }
  return above[b.length]!;
}
