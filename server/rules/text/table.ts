import type { TableRows } from '../ast.js';
import type { ProblemList } from '../problems.js';
import { MOST_ROWS } from './caps.js';

const NUMBER = /^\d{1,9}(\.\d{1,9})?$/;
const MOST_COMPLAINTS = 5;

/**
 * Reads a table: `time_s`, or `lap,place_cm`, one row each, in order. A blank last line is allowed,
 * and lines beginning with `#`.
 * @returns undefined after reporting what is wrong, each with its line
 */
export function readTable(
  text: string,
  file: number,
  problems: ProblemList,
): TableRows | undefined {
  const lines = linesOf(text);
  const [header] = lines;
  const columns = header?.text.split(',').map((column) => column.trim().toLowerCase()) ?? [];
  const at = {
    file,
    start: header?.start ?? 0,
    end: header ? header.start + header.text.length : 0,
  };
  const expected = 'a first line `time_s`, or `lap,place_cm`';
  const kind = columns.join(',');
  if (kind !== 'time_s' && kind !== 'lap,place_cm') {
    problems.report('badTable', at, 'the first line names no columns that are known', { expected });
    return undefined;
  }
  if (lines.length > MOST_ROWS + 1) {
    problems.report('badTable', at, `more than ${MOST_ROWS} rows`);
    return undefined;
  }
  if (lines.length < 2) {
    problems.report('badTable', at, 'the table has no rows');
    return undefined;
  }
  const rows = new RowReader(file, problems, columns.length);
  return kind === 'time_s' ? times(lines, rows) : places(lines, rows);
}

interface Line {
  readonly text: string;
  readonly start: number;
}

function linesOf(text: string): Line[] {
  const lines: Line[] = [];
  let start = 0;
  for (const raw of text.split('\n')) {
    const line = raw.endsWith('\r') ? raw.slice(0, -1) : raw;
    if (line.trim() !== '' && !line.startsWith('#')) lines.push({ text: line, start });
    start += raw.length + 1;
  }
  return lines;
}

class RowReader {
  private complaints = 0;
  constructor(
    private readonly file: number,
    private readonly problems: ProblemList,
    private readonly width: number,
  ) {}

  numbers(line: Line): number[] | undefined {
    const cells = line.text.split(',').map((cell) => cell.trim());
    if (cells.length === this.width && cells.every((cell) => NUMBER.test(cell)))
      return cells.map(Number);
    const expected =
      this.width === 1 ? 'one number, such as `12.5`' : 'two numbers, such as `4,86.9`';
    this.complain('badTable', line, 'this row cannot be read', expected);
    return undefined;
  }

  complain(code: 'badTable' | 'tableOrder', line: Line, message: string, expected?: string): void {
    if (++this.complaints > MOST_COMPLAINTS) return;
    const at = { file: this.file, start: line.start, end: line.start + line.text.length };
    this.problems.report(code, at, message, { expected });
  }

  get failed(): boolean {
    return this.complaints > 0;
  }
}

function times(lines: readonly Line[], rows: RowReader): TableRows | undefined {
  const timeUs: number[] = [];
  for (const line of lines.slice(1)) {
    const cells = rows.numbers(line);
    if (!cells) continue;
    const time = Math.round(cells[0]! * 1e6);
    if (time <= (timeUs.at(-1) ?? -1)) {
      rows.complain('tableOrder', line, 'not later than the row before', 'rows in order of time');
    }
    timeUs.push(time);
  }
  return rows.failed ? undefined : { kind: 'times', timeUs };
}

function places(lines: readonly Line[], rows: RowReader): TableRows | undefined {
  const lap: number[] = [];
  const placeCm: number[] = [];
  for (const line of lines.slice(1)) {
    const cells = rows.numbers(line);
    if (!cells) continue;
    const [lapNow, placeNow] = cells as [number, number];
    if (!Number.isInteger(lapNow) || lapNow < 1) {
      rows.complain('badTable', line, 'a lap is a whole number from 1', 'whole laps');
    }
    const before = lap.at(-1) ?? 0;
    if (lapNow < before || (lapNow === before && placeNow <= placeCm.at(-1)!)) {
      rows.complain(
        'tableOrder',
        line,
        'not after the row before',
        'rows in order of lap, then place',
      );
    }
    lap.push(lapNow);
    placeCm.push(placeNow);
  }
  return rows.failed ? undefined : { kind: 'places', lap, placeCm };
}
