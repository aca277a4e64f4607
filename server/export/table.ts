/** What a column's values are, for readers that want to know before they read. */
export type ColumnType = 'number' | 'integer' | 'text' | 'yes/no';

export interface Column {
  /** With its unit at the end where it has one: `rise_s`, `position_cm`. */
  readonly name: string;
  readonly type: ColumnType;
  /** In SI or the field's own units; empty for what has none. */
  readonly unit: string;
  readonly meaning: string;
}

/** A cell as written: numbers have the digits they are meant to have; empty is not known. */
export type Cell = string;

export interface Table {
  readonly name: string;
  readonly meaning: string;
  readonly columns: readonly Column[];
  readonly rows: Iterable<readonly Cell[]>;
}

/** Microseconds as seconds, exact to the microsecond. */
export function seconds(us: number | null): Cell {
  return us === null ? '' : (us / 1e6).toFixed(6);
}

/** A number with so many decimals; nothing for null and NaN. */
export function fixed(value: number | null, decimals: number): Cell {
  if (value === null || Number.isNaN(value)) return '';
  const text = value.toFixed(decimals);
  return /^-0(\.0*)?$/.test(text) ? text.slice(1) : text;
}

export function yes(value: boolean): Cell {
  return value ? '1' : '0';
}

/** One record of RFC 4180: fields with a comma, a quote or a line break stand in quotes; CR LF. */
export function csvLine(cells: readonly Cell[]): string {
  return `${cells.map(quoted).join(',')}\r\n`;
}

function quoted(cell: Cell): string {
  return /[",\r\n]/.test(cell) ? `"${cell.replaceAll('"', '""')}"` : cell;
}
