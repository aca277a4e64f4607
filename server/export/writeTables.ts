import fs from 'node:fs';
import path from 'node:path';
import type { SessionData } from '../analysis/readSession.js';
import { packageRoot } from '../packageRoot.js';
import { explainTables, exportFolder, writeInto } from './exportFolder.js';
import { csvLine, type Table } from './table.js';
import { tablesOf } from './tables.js';

const LOADERS = ['load_session.py', 'load_session.R', 'load_session.m'];
const PIECE = 1 << 18;

/**
 * Writes a folder of CSV tables (RFC 4180, UTF-8), a data dictionary, a page and a loader each for
 * Python, R and Octave. An earlier export in its place is replaced as a whole; the same record gives
 * the same bytes.
 * @param into the folder to make
 * @param progress called with the share done, 0 to 1
 * @throws LapwingError EXPORT_FOLDER_BAD
 */
export function writeTables(
  session: SessionData,
  into: string,
  progress: (done: number) => void = () => {},
): string {
  return exportFolder(into, (folder) => {
    const tables = tablesOf(session);
    for (const table of tables) writeTable(folder, table, session.samples.length, progress);
    explainTables(folder, session, tables, 'csv', [
      'load_session.py, .R, .m: read the folder in Python, R, Octave (or MATLAB)',
    ]);
    for (const name of LOADERS) {
      const from = path.join(packageRoot, 'server', 'export', 'loaders', name);
      writeInto(folder, name, fs.readFileSync(from, 'utf8'));
    }
  });
}

function writeTable(
  folder: string,
  table: Table,
  most: number,
  progress: (done: number) => void,
): void {
  const fd = fs.openSync(path.join(folder, `${table.name}.csv`), 'wx');
  try {
    let text = csvLine(table.columns.map(({ name }) => name));
    let rows = 0;
    for (const row of table.rows) {
      text += csvLine(row);
      rows++;
      if (text.length < PIECE) continue;
      fs.writeFileSync(fd, text);
      text = '';
      progress(rows / Math.max(rows, most));
    }
    fs.writeFileSync(fd, text);
    fs.fsyncSync(fd);
  } finally {
    fs.closeSync(fd);
  }
}
