import { figures, type Picture } from '../calibrate/guides/guide.js';

const WIDE = 46;
const HIGH = 12;

/** A picture of what was measured, in text, as lines. */
export function textPicture(picture: Picture): string[] {
  switch (picture.draw) {
    case 'laps':
      return lapLines(picture);
    case 'line':
      return plotLines(picture);
    case 'histogram':
      return histogramLines(picture);
  }
}

/** Each lap as far from the median as it lies; outlying ones with a cross. */
function lapLines({ title, unit, laps, median }: Extract<Picture, { draw: 'laps' }>): string[] {
  const inlying = laps.filter((lap) => !lap.outlying).map((lap) => Math.abs(lap.counts - median));
  const most = Math.max(1, ...inlying);
  const half = Math.floor(WIDE / 2);
  const rows = laps.map(({ counts, outlying }, n) => {
    const off = Math.round(((counts - median) / most) * half);
    const at = Math.max(0, Math.min(WIDE, half + off));
    const cells = [...'·'.repeat(WIDE + 1)];
    cells[half] = '|';
    cells[at] = outlying ? 'x' : 'o';
    const words = outlying ? `${counts}  lies out` : String(counts);
    return `${String(n + 1).padStart(4)} ${cells.join('')} ${words}`;
  });
  return [`${title} (| is the median, ${figures(median, 6)} ${unit})`, ...rows];
}

/** Points and their line; below, what each is off it. */
function plotLines(picture: Extract<Picture, { draw: 'line' }>): string[] {
  const { title, xUnit, yUnit, points, offset, slope } = picture;
  const mostX = Math.max(...points.map(({ x }) => x));
  const mostY = Math.max(...points.map(({ y }) => y));
  const grid = Array.from({ length: HIGH + 1 }, () => new Array<string>(WIDE + 1).fill(' '));
  const put = (x: number, y: number, mark: string) => {
    const column = Math.round((x / mostX) * WIDE);
    const row = HIGH - Math.round((y / mostY) * HIGH);
    if (grid[row]?.[column] !== undefined) grid[row][column] = mark;
  };
  for (let n = 0; n <= WIDE; n++) {
    const x = (mostX * n) / WIDE;
    put(x, offset + slope * x, '.');
  }
  for (const { x, y } of points) put(x, y, 'o');
  const label = (row: number) => (row === 0 ? figures(mostY) : row === HIGH ? '0' : '');
  const rows = grid.map((cells, row) => `${label(row).padStart(7)} |${cells.join('')}`);
  return [
    `${title} (${yUnit} up, ${xUnit} across)`,
    ...rows,
    `${' '.repeat(8)}+${'-'.repeat(WIDE + 1)}`,
    `${' '.repeat(8)} 0${figures(mostX).padStart(WIDE)}`,
    ...points.map(
      ({ x, y, residual, band }) =>
        `  ${figures(x)} ${xUnit}: ${figures(y)} ${yUnit}, ${residual >= 0 ? '+' : ''}${figures(residual, 2)} off the line (band +-${figures(band, 2)})`,
    ),
  ];
}

/** Bins that hold anything, and those between them, as bars. */
function histogramLines(picture: Extract<Picture, { draw: 'histogram' }>): string[] {
  const { title, unit, edges, counts, marks } = picture;
  const most = Math.max(1, ...counts);
  const first = counts.findIndex((count) => count > 0);
  const last = counts.findLastIndex((count) => count > 0);
  const rows: string[] = [];
  for (let bin = Math.max(0, first); bin <= last; bin++) {
    const from = edges[bin]!;
    const to = edges[bin + 1]!;
    const here = marks.filter(({ at }) => at >= from && at < to).map(({ label }) => label);
    const bar = '#'.repeat(Math.ceil((counts[bin]! / most) * (WIDE - 8)));
    const words = here.length === 0 ? '' : `  <- ${here.join(', ')}`;
    rows.push(
      `${figures(from).padStart(9)} |${bar}${counts[bin] ? ` ${counts[bin]}` : ''}${words}`,
    );
  }
  return [`${title}, ${unit}`, ...rows];
}
