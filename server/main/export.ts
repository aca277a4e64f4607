import { join, resolve } from 'node:path';
import { Command } from 'commander';
import { readSession } from '../analysis/readSession.js';
import { LapwingError } from '../errors/codes.js';
import { derivedFolder, writeTables } from '../export/writeTables.js';
import { progressBar } from './progressBar.js';

/** `lapwing export SESSION --to tables`: what the record holds, for other programs to read. */
export function exportCommand(): Command {
  return new Command('export')
    .description("write a session's data for other programs")
    .argument('<session>', 'the session folder')
    .requiredOption('--to <format>', '`tables` (CSV)')
    .option('--into <path>', "where to write it; else below the session's own `derived`")
    .option('--json', 'print what was written as JSON')
    .action(async (folder: string, flags: { to: string; into?: string; json?: boolean }) => {
      if (flags.to !== 'tables') throw new LapwingError('exportFormatUnknown', `--to ${flags.to}`);
      const bar = progressBar('writing');
      const session = await readSession(folder);
      const into = resolve(flags.into ?? join(derivedFolder(folder), 'tables'));
      writeTables(session, into, (done) => bar.show(done));
      bar.clear();
      const result = { format: flags.to, path: into };
      process.stdout.write(flags.json ? `${JSON.stringify(result)}\n` : `${into}\n`);
    });
}
