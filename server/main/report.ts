import { join, resolve } from 'node:path';
import { Command, InvalidArgumentError } from 'commander';
import { type LearningDay, learningDay } from '../analysis/learning.js';
import type { Loopback } from '../analysis/loopback.js';
import { readSession } from '../analysis/readSession.js';
import { LapwingError } from '../errors/codes.js';
import { derivedFolder } from '../export/exportFolder.js';
import { animalsPage, animalsSummary } from '../export/report/animalsPage.js';
import { learningPage } from '../export/report/learningPage.js';
import { reportPage } from '../export/report/page.js';
import { writeFileWhole } from '../session/writeFileWhole.js';
import { progressBar } from './progressBar.js';

interface ReportFlags {
  into?: string;
  loopback?: Loopback;
  json?: boolean;
}

/**
 * `lapwing report SESSION`: the session as one HTML page for the lab book; of several sessions of one
 * animal, learning across them; of several animals, what they have in common.
 */
export function reportCommand(): Command {
  return new Command('report')
    .description('write one self-contained page on a session, for the screen and for paper')
    .argument(
      '<session...>',
      'the session folder; several of one animal: learning; of several animals: compared',
    )
    .option(
      '--into <file>',
      "where to write it; else report.html in the session's own `derived`; of several, learning.html or animals.html here",
    )
    .option('--loopback <output=input>', 'an output that is wired back to an input', loopbackOf)
    .option('--json', 'print what was written as JSON')
    .action(async (folders: string[], flags: ReportFlags, command: Command) => {
      // The same session twice would count twice.
      const different = [...new Set(folders.map((each) => resolve(each)))];
      if (different.length > 1) {
        if (flags.loopback) command.error('error: --loopback is for one session');
        reportOnSeveral(await daysOf(different), flags);
        return;
      }
      const folder = different[0]!;
      const bar = progressBar('reading');
      const data = await readSession(folder, (done) => bar.show(done));
      bar.clear();
      const page = reportPage(data, flags.loopback);
      const session = learningDay(data);
      write(flags.into ?? join(derivedFolder(folder), 'report.html'), page, flags, { session });
    });
}

function reportOnSeveral(days: readonly LearningDay[], flags: ReportFlags): void {
  const { animals, across, change } = animalsSummary(days);
  if (animals.length === 1)
    write(flags.into ?? 'learning.html', learningPage(days), flags, { sessions: days });
  else write(flags.into ?? 'animals.html', animalsPage(days), flags, { animals, across, change });
}

function write(into: string, page: string, { json }: ReportFlags, more: object = {}): void {
  const file = resolve(into);
  try {
    writeFileWhole(file, page);
  } catch (error) {
    throw new LapwingError('exportFolderBad', `${file}: ${(error as Error).message}`, {
      cause: error,
    });
  }
  const result = { path: file, ...more };
  process.stdout.write(json ? `${JSON.stringify(result)}\n` : `${file}\n`);
}

async function daysOf(folders: readonly string[]): Promise<LearningDay[]> {
  const bar = progressBar('reading');
  const days: LearningDay[] = [];
  for (const folder of folders) {
    const show = (done: number) => bar.show((days.length + done) / folders.length);
    days.push(learningDay(await readSession(folder, show)));
  }
  bar.clear();
  return days;
}

function loopbackOf(text: string): Loopback {
  const [output, input] = text.split('=');
  if (output && input) return { output, input };
  throw new InvalidArgumentError('expected OUTPUT=INPUT, by their names in the rig file');
}
