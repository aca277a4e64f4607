/**
 * The child process that finishes a record and replays it: `node finishProcess.js FOLDER`. It prints one line of
 * JSON, the result or the error, so that the loop's own process has neither the work nor the memory.
 */
import os from 'node:os';
import { LapwingError } from '../../errors/codes.js';
import { closeRecord } from '../closeRecord.js';

try {
  // Another session may be running by now.
  os.setPriority(os.constants.priority.PRIORITY_LOW);
} catch {
  // It finishes at the usual priority then.
}
try {
  const folder = process.argv[2] ?? '';
  const { finished } = await closeRecord(folder);
  process.stdout.write(JSON.stringify({ finished }) + '\n');
} catch (error) {
  const { message } = error as Error;
  const code = error instanceof LapwingError ? error.code : 'RECORD_UNFINISHED';
  process.stdout.write(JSON.stringify({ error: { code, message } }) + '\n');
  process.exitCode = 1;
}
