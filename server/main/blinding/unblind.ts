import { rmSync, statSync } from 'node:fs';
import { Command } from 'commander';
import { LapwingError } from '../../errors/codes.js';
import { openAll } from '../../session/blinding/allocation.js';
import { readAllocation, readKey } from '../../session/blinding/arms.js';
import { logOpening, openingsFile, unblindSession } from '../../session/blinding/openings.js';
import { summaryPath } from '../../web/records/made.js';
import { loginName } from '../arguments.js';
import { columns } from '../columns.js';

interface UnblindFlags {
  readonly reason: string;
  readonly key?: string;
  readonly by: string;
  readonly json?: boolean;
}

/** `lapwing unblind SESSION --reason WHY`, or a whole allocation at the end of the study. */
export function unblindCommand(): Command {
  return new Command('unblind')
    .description('open the sealed arm of a session, or of a whole allocation; it is logged')
    .argument('<session>', 'the session folder, or the allocation to open all of it')
    .requiredOption('--reason <text>', 'why; it is kept')
    .option('--key <file>', 'the key, if it is not where the rig file said')
    .option('--by <name>', 'who opens it', loginName())
    .option('--json', 'print JSON instead of words')
    .action((path: string, flags: UnblindFlags) => {
      if (flags.reason.trim() === '') {
        throw new LapwingError('blindingBad', 'A reason is needed.');
      }
      if (statSync(path, { throwIfNoEntry: false })?.isDirectory()) one(path, flags);
      else all(path, flags);
    });
}

function one(folder: string, { reason, key, by, json }: UnblindFlags): void {
  const opened = unblindSession(folder, { reason, key, by });
  // It was made while the arm was hidden.
  rmSync(summaryPath(folder), { force: true });
  const words = `${opened.arm}: opened ${opened.at} by ${opened.by} (${opened.reason})`;
  process.stdout.write(`${json ? JSON.stringify(opened) : words}\n`);
}

function all(file: string, { reason, key, by, json }: UnblindFlags): void {
  const allocation = readAllocation(file);
  if (key === undefined) throw new LapwingError('blindingKey', 'Give it with --key.');
  const secret = readKey(key);
  logOpening(file, by, reason);
  const opening = openAll(allocation, secret);
  const rows = opening.slots.map(({ subject, session, arm }) => [
    subject,
    session === null ? 'every session' : `session ${session}`,
    arm,
  ]);
  const words = [
    columns([['animal', 'session', 'arm'], ...rows]),
    `as committed to: ${allocation.commitment}`,
    `logged in ${openingsFile(file)}`,
  ];
  process.stdout.write(`${json ? JSON.stringify(opening) : words.join('\n')}\n`);
}
