import { join, resolve } from 'node:path';
import { Command } from 'commander';
import { readSession } from '../analysis/readSession.js';
import { LapwingError } from '../errors/codes.js';
import { derivedFolder } from '../export/exportFolder.js';
import { exportNwb } from '../export/nwb/exportNwb.js';
import { writeParquet } from '../export/writeParquet.js';
import { writeTables } from '../export/writeTables.js';
import { progressBar } from './progressBar.js';

/** What each writes into a folder of its name. */
const FOLDERS = { tables: writeTables, parquet: writeParquet } as const;

/** `lapwing export SESSION --to tables|parquet|nwb`: what the record holds, for other programs to read. */
export function exportCommand(): Command {
  return new Command('export')
    .description("write a session's data for other programs")
    .argument('<session>', 'the session folder')
    .requiredOption(
      '--to <format>',
      '`tables` (a folder of CSV), `parquet` (the same as Parquet) or `nwb` (one NWB 2.10 file)',
    )
    .option('--into <path>', "where to write it; else below the session's own `derived`")
    .option('--json', 'print what was written as JSON')
    .action(async (folder: string, flags: { to: string; into?: string; json?: boolean }) => {
      const written = await write(folder, flags.to, flags.into && resolve(flags.into));
      const result = { format: flags.to, path: written };
      process.stdout.write(flags.json ? `${JSON.stringify(result)}\n` : `${written}\n`);
    });
}

async function write(folder: string, format: string, into: string | undefined): Promise<string> {
  const bar = progressBar('exporting');
  if (format === 'nwb') {
    const file = into ?? join(derivedFolder(resolve(folder)), 'session.nwb');
    const written = await exportNwb(folder, file, (done) => bar.show(done));
    bar.clear();
    return written;
  }
  if (format !== 'tables' && format !== 'parquet')
    throw new LapwingError('exportFormatUnknown', `--to ${format}.`);
  const session = await readSession(folder, (done) => bar.show(done / 4));
  const path = into ?? join(derivedFolder(resolve(folder)), format);
  FOLDERS[format](session, path, (done) => bar.show(0.25 + 0.75 * done));
  bar.clear();
  return path;
}
