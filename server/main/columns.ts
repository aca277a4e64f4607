/** Rows of cells in columns as wide as they need. */
export function columns(rows: readonly (readonly string[])[]): string {
  const widths = rows[0]!.map((_, n) => Math.max(...rows.map((row) => row[n]!.length)));
  return rows
    .map((row) =>
      row
        .map((cell, n) => cell.padEnd(widths[n]!))
        .join('  ')
        .trimEnd(),
    )
    .join('\n');
}
