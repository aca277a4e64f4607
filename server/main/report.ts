import { join, resolve } from 'node:path';
import { Command, InvalidArgumentError } from 'commander';
import { type LearningDay, learningDay } from '../analysis/learning.js';
import { readSession } from '../analysis/readSession.js';
import { LapwingError } from '../errors/codes.js';
import { derivedFolder } from '../export/exportFolder.js';
import { learningPage } from '../export/report/learningPage.js';
import { reportPage } from '../export/report/page.js';
import type { Loopback } from '../export/report/tables.js';
import { writeFileWhole } from '../session/writeFileWhole.js';
import { progressBar } from './progressBar.js';

interface ReportFlags {
  into?: string;
  loopback?: Loopback;
  json?: boolean;
}

/**
 * `lapwing report SESSION`: the session as one HTML page for the lab book; of several sessions of one
 * subject, learning across them.
 */
export function reportCommand(): Command {
  return new Command('report')
    .description('write one self-contained page on a session, for the screen and for paper')
    .argument('<session...>', 'the session folder; several of one subject: learning across them')
    .option('--into <file>', "where to write it; else report.html in the session's own `derived`")
    .option('--loopback <output=input>', 'an output that is wired back to an input', loopbackOf)
    .option('--json', 'print what was written as JSON')
    .action(async (folders: string[], flags: ReportFlags) => {
      const folder = folders[0]!;
      if (folders.length > 1) {
        const days = await daysOf(folders);
        write(resolve(flags.into ?? 'learning.html'), learningPage(days), flags, days);
        return;
      }
      const bar = progressBar('reading');
      const session = await readSession(folder, (done) => bar.show(done));
      bar.clear();
      const page = reportPage(session, flags.loopback);
      const file = resolve(flags.into ?? join(derivedFolder(folder), 'report.html'));
      write(file, page, flags);
    });
}

function write(file: string, page: string, { json }: ReportFlags, days?: LearningDay[]): void {
  try {
    writeFileWhole(file, page);
  } catch (error) {
    throw new LapwingError('exportFolderBad', `${file}: ${(error as Error).message}`, {
      cause: error,
    });
  }
  const result = days === undefined ? { path: file } : { path: file, sessions: days };
  process.stdout.write(json ? `${JSON.stringify(result)}\n` : `${file}\n`);
}

async function daysOf(folders: readonly string[]): Promise<LearningDay[]> {
  const bar = progressBar('reading');
  const days: LearningDay[] = [];
  for (const folder of folders) {
    days.push(learningDay(await readSession(folder)));
    bar.show(days.length / folders.length);
  }
  bar.clear();
  const subjects = [...new Set(days.map(({ subject }) => subject))];
  if (subjects.length > 1)
    throw new LapwingError('reportSubjects', `The sessions are of ${subjects.join(', ')}.`);
  return days;
}

function loopbackOf(text: string): Loopback {
  const [output, input] = text.split('=');
  if (output && input) return { output, input };
  throw new InvalidArgumentError('expected OUTPUT=INPUT, by their names in the rig file');
}
