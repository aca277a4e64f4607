import { askChild, compiledScript } from '../../askChild.js';
import type { Finished } from './finishRecord.js';

/**
 * Finishes the record of an ended session in a process of its own (`finishRecord`, `mend`), at low
 * priority. Throws as they do, and `RECORD_UNFINISHED` where the process died: the live record is
 * then as it was.
 */
export async function finish(
  folder: string,
  script = compiledScript(import.meta.url, './finishProcess.js'),
): Promise<Finished> {
  const question = { script, args: [folder], about: folder, failure: 'recordUnfinished' } as const;
  return (await askChild<{ finished: Finished }>(question)).finished;
}
