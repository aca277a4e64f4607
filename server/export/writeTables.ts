import fs from 'node:fs';
import path from 'node:path';
import type { SessionData } from '../analysis/readSession.js';
import { LapwingError } from '../errors/codes.js';
import { packageRoot } from '../packageRoot.js';
import { syncFolder } from '../session/writeFileWhole.js';
import { csvLine, type Table } from './table.js';
import { tablesOf } from './tables.js';

const LOADERS = ['load_session.py', 'load_session.R', 'load_session.m'];
const PIECE = 1 << 18;

/** Where an export goes unless it is told: derived from the record, so it can be made again. */
export function derivedFolder(sessionFolder: string): string {
  const folder = path.join(sessionFolder, 'derived');
  fs.mkdirSync(folder, { recursive: true });
  return folder;
}

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
  const temporary = `${into}.${process.pid}.new`;
  try {
    fs.rmSync(temporary, { recursive: true, force: true });
    fs.mkdirSync(temporary, { recursive: true });
    const tables = tablesOf(session);
    for (const table of tables) writeTable(temporary, table, session.samples.length, progress);
    writeWhole(temporary, 'dictionary.csv', dictionary(tables));
    writeWhole(temporary, 'README.txt', page(session, tables));
    for (const name of LOADERS) {
      const from = path.join(packageRoot, 'server', 'export', 'loaders', name);
      writeWhole(temporary, name, fs.readFileSync(from, 'utf8'));
    }
    const old = `${into}.${process.pid}.old`;
    if (fs.existsSync(into)) {
      // A folder that is no export is somebody's own: it is not put aside, let alone removed.
      if (!fs.existsSync(path.join(into, 'dictionary.csv')))
        throw new Error('there is something else already');
      fs.renameSync(into, old);
    }
    fs.renameSync(temporary, into);
    fs.rmSync(old, { recursive: true, force: true });
    syncFolder(path.dirname(into));
  } catch (error) {
    fs.rmSync(temporary, { recursive: true, force: true });
    throw new LapwingError('exportFolderBad', `${into}: ${(error as Error).message}`, {
      cause: error,
    });
  }
  return into;
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

function writeWhole(folder: string, name: string, text: string): void {
  fs.writeFileSync(path.join(folder, name), text, { flag: 'wx', flush: true });
}

/** The data dictionary: a row for each column of each table. */
function dictionary(tables: readonly Table[]): string {
  const head = csvLine(['table', 'column', 'type', 'unit', 'meaning']);
  return tables.reduce(
    (text, { name, columns }) =>
      columns.reduce((more, c) => more + csvLine([name, c.name, c.type, c.unit, c.meaning]), text),
    head,
  );
}

function page(
  { description, rig, beganUs, endedUs, state }: SessionData,
  tables: readonly Table[],
) {
  const { name, subject, title, startedAt } = description;
  const missing = description.record?.missing ?? [];
  return [
    `Session ${name}: subject ${subject}, ${title}`,
    `Started ${startedAt}; ${((endedUs - beganUs) / 60e6).toFixed(2)} min; record ${state.state}.`,
    ...missing.map((what) => `Missing: ${what}`),
    '',
    "Time zero is the session's beginning by the board's clock; times are exact to a microsecond of",
    'that clock. Its wall time is good to the computer clock only; to put another',
    "instrument's clock beside it use `lapwing align`.",
    `Position is cm along the belt (${rig.belt.lengthCm} cm), from 0 cm at the seam mark's place.`,
    'Before the first mark position is not known: that partial stretch is lap 0, and its positions',
    'are empty. Laps count progress: backing over 0 cm and coming forward again adds none.',
    'Laps that the operator excluded are here, with excluded = 1; nothing is left out.',
    'An empty cell is not known or does not apply; 1 is yes, 0 is no.',
    '',
    ...tables.map((table) => `${table.name}.csv: ${table.meaning}`),
    'dictionary.csv: every column with its type, unit and meaning',
    'load_session.py, .R, .m: read the folder in Python, R, Octave (or MATLAB)',
    '',
  ].join('\n');
}
