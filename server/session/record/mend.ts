import fs from 'node:fs';
import path from 'node:path';
import { rfc3339, type SessionDescription, updateDescription } from '../description.js';
import { type Finished, finishRecord } from './finishRecord.js';
import { readRecord } from './readRecord.js';
import { describeTroubles } from './recordState.js';

/**
 * Finishes a session's record and notes in `session.json` what it was found to be. A session that
 * was never ended is ended here, as `mended`, at the time of the last thing recorded. Throws as
 * `finishRecord` does; a folder without a description is finished all the same.
 */
export async function mend(folder: string, progress?: (done: number) => void): Promise<Finished> {
  const finished = await finishRecord(folder, progress);
  if (!fs.existsSync(path.join(folder, 'session.json'))) return finished;
  const { state, bytes } = finished;
  const { messages, lastInput } = state;
  const missing = describeTroubles(state);
  const record = { state: state.state, messages, lastInput, bytes, missing };
  const change: Partial<SessionDescription> = { record };
  const ended = await endOf(folder);
  updateDescription(folder, ended === undefined ? change : { ...change, ended });
  return finished;
}

/** How a session ended whose program died before it could say; undefined where it did say. */
async function endOf(folder: string): Promise<SessionDescription['ended'] | undefined> {
  const text = fs.readFileSync(path.join(folder, 'session.json'), 'utf8');
  if ((JSON.parse(text) as SessionDescription).ended !== null) return undefined;
  const reader = await readRecord(folder);
  reader.visit({});
  const reason = 'the program stopped without ending the session';
  return { how: 'mended', at: rfc3339(new Date(reader.timeUs / 1000)), reason };
}
