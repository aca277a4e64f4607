import path from 'node:path';
import type { SchemaElement } from 'hyparquet';
import { fileWriter, ParquetWriter } from 'hyparquet-writer';
import type { SessionData } from '../analysis/readSession.js';
import { packageVersion } from '../packageRoot.js';
import { syncFile } from '../session/writeFileWhole.js';
import { explainTables, exportFolder } from './exportFolder.js';
import type { Cell, Column, ColumnType, Table } from './table.js';
import { tablesOf } from './tables.js';

/** Rows that are held and written at once: a row group. */
const GROUP = 1 << 16;

/** How each type is stored. A text has no empty value: what is not known is empty text. */
const STORED: Readonly<Record<ColumnType, Omit<SchemaElement, 'name'>>> = {
  number: { type: 'DOUBLE', repetition_type: 'OPTIONAL' },
  // Counts are signed 32 bits; inputs of a session are fewer.
  integer: { type: 'INT32', repetition_type: 'OPTIONAL' },
  'yes/no': { type: 'BOOLEAN', repetition_type: 'OPTIONAL' },
  text: { type: 'BYTE_ARRAY', converted_type: 'UTF8', repetition_type: 'REQUIRED' },
};

/**
 * Writes a folder of Parquet files: the same tables as `writeTables`, with the same values. Each file
 * says in its metadata which table it is (`lapwing.table`, `lapwing.meaning`), of which session
 * (`lapwing.session`), and of each column the type, unit and meaning (`lapwing.columns`, JSON). The
 * same record gives the same bytes.
 * @param into the folder to make; an earlier export in its place is replaced as a whole
 * @param progress called with the share done, 0 to 1
 * @throws LapwingError EXPORT_FOLDER_BAD
 */
export function writeParquet(
  session: SessionData,
  into: string,
  progress: (done: number) => void = () => {},
): string {
  return exportFolder(into, (folder) => {
    const tables = tablesOf(session);
    for (const table of tables) writeTable(folder, session, table, progress);
    explainTables(folder, session, tables, 'parquet');
  });
}

function writeTable(
  folder: string,
  session: SessionData,
  table: Table,
  progress: (done: number) => void,
): void {
  const { columns } = table;
  const file = path.join(folder, `${table.name}.parquet`);
  const writer = new ParquetWriter({
    writer: fileWriter(file),
    schema: [
      { name: table.name, num_children: columns.length },
      ...columns.map(({ name, type }) => ({ name, ...STORED[type] })),
    ],
    kvMetadata: [
      { key: 'lapwing.session', value: session.description.name },
      { key: 'lapwing.table', value: table.name },
      { key: 'lapwing.meaning', value: table.meaning },
      { key: 'lapwing.columns', value: JSON.stringify(columns) },
    ],
    createdBy: `lapwing ${packageVersion}`,
  });
  let rows: (readonly Cell[])[] = [];
  let written = 0;
  const put = () => {
    const columnData = columns.map((column, c) => ({
      ...{ name: column.name, data: rows.map((row) => storedValue(column, row[c]!)) },
    }));
    writer.write({ columnData, rowGroupSize: GROUP });
    written += rows.length;
    rows = [];
    progress(written / Math.max(written, session.samples.length));
  };
  for (const row of table.rows) {
    rows.push(row);
    if (rows.length === GROUP) put();
  }
  if (rows.length > 0) put();
  writer.finish();
  syncFile(file);
}

function storedValue({ type }: Column, cell: Cell): string | number | boolean | null {
  if (type === 'text') return cell;
  if (cell === '') return null;
  return type === 'yes/no' ? cell === '1' : Number(cell);
}
