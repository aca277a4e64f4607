import { closeSync, fsyncSync, openSync, writeSync } from 'node:fs';
import { basename } from 'node:path';
import { LapwingError } from '../../errors/codes.js';
import { readDescription, rfc3339, updateDescription } from '../description.js';
import { openSlot } from './allocation.js';
import { type Opened, readKey } from './arms.js';

/** Beside the allocation: who opened what, when and why, a line of JSON each, only ever added to. */
export function openingsFile(allocation: string): string {
  return `${allocation}.openings.jsonl`;
}

/**
 * Opens the arm of one session. It is noted in the allocation's log first, so that nothing is opened
 * without a trace, and then in the session's description.
 * @throws LapwingError BLINDING_NONE, BLINDING_KEY, BLINDING_BAD where the log cannot be written
 */
export function unblindSession(
  folder: string,
  {
    by,
    reason,
    key,
    now = new Date(),
  }: {
    readonly by: string;
    readonly reason: string;
    readonly key?: string | undefined;
    readonly now?: Date;
  },
): Opened {
  const { blinding, ended } = readDescription(folder);
  if (blinding === undefined) {
    throw new LapwingError('blindingNone', `${folder} has no sealed arm.`);
  }
  if (ended === null) {
    throw new LapwingError('blindingBad', `${folder} has not ended, or was never mended.`);
  }
  if (blinding.opened !== undefined) return blinding.opened;
  const arm = openSlot(blinding.allocation, blinding.slot, readKey(key ?? blinding.key));
  const at = rfc3339(now);
  log(openingsFile(blinding.file), { at, by, reason, session: basename(folder), arm });
  const opened = { at, by, reason, arm };
  updateDescription(folder, { blinding: { ...blinding, opened } });
  return opened;
}

/** Notes that a whole allocation was opened. */
export function logOpening(allocation: string, by: string, reason: string, now = new Date()): void {
  log(openingsFile(allocation), { at: rfc3339(now), by, reason, session: null });
}

function log(file: string, line: object): void {
  try {
    const fd = openSync(file, 'a', 0o644);
    try {
      writeSync(fd, `${JSON.stringify(line)}\n`);
      fsyncSync(fd);
    } finally {
      closeSync(fd);
    }
  } catch (error) {
    const what = `${file}: ${(error as Error).message}`;
    throw new LapwingError('blindingBad', what, { cause: error });
  }
}
