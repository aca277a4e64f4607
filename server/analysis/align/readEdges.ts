import { LapwingError } from '../../errors/codes.js';

export interface EdgeFileOptions {
  /** Samples a second: the file's numbers are samples. Undefined: they are seconds. */
  readonly rateHz?: number;
  /** Name of the CSV column that holds the times. */
  readonly column?: string;
}

/** A pause this many times the usual interval begins a new acquisition. */
const PAUSE = 50;

/**
 * Reads edge times: one number a line, or a CSV table with a header. A column `acquisition` parts
 * several acquisitions; without one, a time that goes backwards does, or a pause of 50 usual
 * intervals. Returns each one's times in seconds, rising.
 * @throws LapwingError ALIGN_EDGES_BAD with the line
 */
export function readEdges(text: string, options: EdgeFileOptions = {}): number[][] {
  const bad = (why: string) => new LapwingError('alignEdgesBad', why);
  const lines = text.replace(/^\uFEFF/, '').split(/\r\n|\n|\r/);
  const rows = lines.map((line) => line.split(/[,;\t]/).map((cell) => cell.trim()));
  const hasHeader = rows[0]!.some((cell) => cell !== '' && Number.isNaN(Number(cell)));
  const header = hasHeader ? rows[0]! : [];
  let at = 0;
  if (options.column !== undefined) at = header.indexOf(options.column);
  else if (header.length > 1) {
    at = header.findIndex((name) => /^(time|times|edge|sample)/i.test(name));
    if (at < 0) throw bad(`say with --column which of ${header.join(', ')} holds the times`);
  }
  if (at < 0) throw bad(`there is no column ${options.column}; there are: ${header.join(', ')}`);
  const group = header.indexOf('acquisition');
  const acquisitions: { times: number[]; of: string }[] = [];
  for (let i = hasHeader ? 1 : 0; i < rows.length; i++) {
    const row = rows[i]!;
    if (row.length === 1 && row[0] === '') continue;
    const value = Number(row[at]);
    if (row[at] === undefined || row[at] === '' || !Number.isFinite(value))
      throw bad(`line ${i + 1}: expected a number, found "${row[at] ?? ''}"`);
    const seconds = options.rateHz === undefined ? value : value / options.rateHz;
    const of = group < 0 ? '' : (row[group] ?? '');
    const open = acquisitions.at(-1);
    const backwards = open !== undefined && seconds < open.times.at(-1)!;
    if (open === undefined || open.of !== of || (group < 0 && backwards))
      acquisitions.push({ times: [seconds], of });
    else if (backwards) throw bad(`line ${i + 1}: time goes backwards within an acquisition`);
    else open.times.push(seconds);
  }
  if (acquisitions.length === 0) throw bad('there is no time in it');
  return group >= 0
    ? acquisitions.map(({ times }) => times)
    : acquisitions.flatMap(({ times }) => splitAtPauses(times));
}

function splitAtPauses(times: readonly number[]): number[][] {
  const gaps = times.slice(1).map((time, i) => time - times[i]!);
  const usual = [...gaps].sort((a, b) => a - b)[gaps.length >> 1] ?? 0;
  const parts: number[][] = [[]];
  times.forEach((time, i) => {
    if (i > 0 && gaps[i - 1]! > PAUSE * usual && usual > 0) parts.push([]);
    parts.at(-1)!.push(time);
  });
  return parts;
}
