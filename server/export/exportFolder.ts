import fs from 'node:fs';
import path from 'node:path';
import type { SessionData } from '../analysis/readSession.js';
import { LapwingError } from '../errors/codes.js';
import { syncFolder } from '../session/writeFileWhole.js';
import { csvLine, type Table } from './table.js';

/** By it a folder is known as an export that may be replaced. */
const DICTIONARY = 'dictionary.csv';

/** Where an export goes unless it is told: derived from the record, so it can be made again. */
export function derivedFolder(sessionFolder: string): string {
  const folder = path.join(sessionFolder, 'derived');
  fs.mkdirSync(folder, { recursive: true });
  return folder;
}

/**
 * Makes a folder under another name and puts it in place when it is whole; an earlier export is
 * replaced as a whole.
 * @throws LapwingError EXPORT_FOLDER_BAD where that cannot be, or something else is there
 */
export function exportFolder(into: string, fill: (folder: string) => void): string {
  const temporary = `${into}.${process.pid}.new`;
  try {
    fs.rmSync(temporary, { recursive: true, force: true });
    fs.mkdirSync(temporary, { recursive: true });
    fill(temporary);
    const old = `${into}.${process.pid}.old`;
    if (fs.existsSync(into)) {
      // A folder that is no export is somebody's own: it is not put aside, let alone removed.
      if (!fs.existsSync(path.join(into, DICTIONARY)))
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

/**
 * Writes what explains the tables: the data dictionary, and a page in words.
 * @param ending `csv` or `parquet`
 * @param more lines on further files
 */
export function explainTables(
  folder: string,
  session: SessionData,
  tables: readonly Table[],
  ending: string,
  more: readonly string[] = [],
): void {
  writeInto(folder, DICTIONARY, dictionary(tables));
  writeInto(folder, 'README.txt', page(session, tables, ending, more));
}

/** Writes a new file into a folder that is being made, and syncs it. */
export function writeInto(folder: string, name: string, text: string): void {
  fs.writeFileSync(path.join(folder, name), text, { flag: 'wx', flush: true });
}

/** A row for each column of each table. */
function dictionary(tables: readonly Table[]): string {
  const head = csvLine(['table', 'column', 'type', 'unit', 'meaning']);
  const rows = tables.flatMap((table) =>
    table.columns.map((c) => csvLine([table.name, c.name, c.type, c.unit, c.meaning])),
  );
  return head + rows.join('');
}

function page(
  { description, rig, beganUs, endedUs, state }: SessionData,
  tables: readonly Table[],
  ending: string,
  more: readonly string[],
): string {
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
    'Each row says in `input` from which input of the record it came: `lapwing replay` and any MCAP',
    'reader find it there under that number.',
    'The same record gives the same bytes each time.',
    '',
    ...tables.map((table) => `${table.name}.${ending}: ${table.meaning}`),
    `${DICTIONARY}: every column with its type, unit and meaning`,
    ...more,
    '',
  ].join('\n');
}
