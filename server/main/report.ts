import { join, resolve } from 'node:path';
import { Command, InvalidArgumentError } from 'commander';
import { readSession } from '../analysis/readSession.js';
import { LapwingError } from '../errors/codes.js';
import { reportPage } from '../export/report/page.js';
import type { Loopback } from '../export/report/tables.js';
import { derivedFolder } from '../export/writeTables.js';
import { writeFileWhole } from '../session/writeFileWhole.js';
import { progressBar } from './progressBar.js';

interface ReportFlags {
  into?: string;
  loopback?: Loopback;
  json?: boolean;
}

/** `lapwing report SESSION`: the session as one HTML page for the lab book. */
export function reportCommand(): Command {
  return new Command('report')
    .description('write one self-contained page on a session, for the screen and for paper')
    .argument('<session>', 'the session folder')
    .option('--into <file>', "where to write it; else report.html in the session's own `derived`")
    .option('--loopback <output=input>', 'an output that is wired back to an input', loopbackOf)
    .option('--json', 'print what was written as JSON')
    .action(async (folder: string, flags: ReportFlags) => {
      const bar = progressBar('reading');
      const session = await readSession(folder, (done) => bar.show(done));
      bar.clear();
      const page = reportPage(session, flags.loopback);
      const file = resolve(flags.into ?? join(derivedFolder(folder), 'report.html'));
      try {
        writeFileWhole(file, page);
      } catch (error) {
        throw new LapwingError('exportFolderBad', `${file}: ${(error as Error).message}`, {
          cause: error,
        });
      }
      process.stdout.write(flags.json ? `${JSON.stringify({ path: file })}\n` : `${file}\n`);
    });
}

function loopbackOf(text: string): Loopback {
  const [output, input] = text.split('=');
  if (output && input) return { output, input };
  throw new InvalidArgumentError('expected OUTPUT=INPUT, by their names in the rig file');
}
