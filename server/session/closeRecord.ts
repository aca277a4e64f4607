import type { SessionDescription } from './description.js';
import type { Finished } from './record/finishRecord.js';
import { mend } from './record/mend.js';
import { noteReplay } from './selfCheck.js';

/** What a record that was closed was found to be. */
export interface Closed {
  readonly finished: Finished;
  /** Undefined where the folder holds no copies of its files, so that nothing can be replayed. */
  readonly replay: SessionDescription['replay'];
}

/**
 * Finishes the record of a session that is over, however it ended, replays it, and notes both in the
 * description. Throws as `mend` does.
 * @param progress called with the share done, 0 to 1
 */
export async function closeRecord(
  folder: string,
  progress: (done: number) => void = () => {},
): Promise<Closed> {
  const finished = await mend(folder, (done) => progress(done / 2));
  const replay = await noteReplay(folder, (done) => progress((1 + done) / 2));
  return { finished, replay };
}
