/**
 * The child process that writes an NWB file: `node nwbProcess.js SESSION FILE`. The library works
 * synchronously and needs the memory of the whole session. It prints
 * lines of JSON: how far it is, and at last the result.
 */
import { readSession } from '../../analysis/readSession.js';
import { LapwingError } from '../../errors/codes.js';
import { rfc3339 } from '../../session/description.js';
import { writeNwb } from './writeNwb.js';

const [folder = '', file = ''] = process.argv.slice(2);
try {
  const tell = (done: number) => process.stdout.write(`${JSON.stringify({ done })}\n`);
  // Reading takes about a third of the time.
  const session = await readSession(folder, (done) => tell(done / 3));
  await writeNwb(session, file, rfc3339(new Date()), (done) => tell((1 + 2 * done) / 3));
  process.stdout.write(`${JSON.stringify({ path: file })}\n`);
} catch (error) {
  const code = error instanceof LapwingError ? error.code : 'EXPORT_FOLDER_BAD';
  process.stdout.write(
    `${JSON.stringify({ error: { code, message: (error as Error).message } })}\n`,
  );
  process.exitCode = 1;
}
