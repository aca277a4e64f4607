import fs from 'node:fs';
import path from 'node:path';
import { type SessionDescription, updateDescription } from './description.js';
import { loadSession } from './loadSession.js';
import { replaySession } from './replay.js';

type ReplayNote = NonNullable<SessionDescription['replay']>;

/**
 * Replays a session that has ended and notes in `session.json` whether every decision came out the
 * same. A folder that holds no copies of its files (a bare record) is left as it is: undefined.
 */
export async function noteReplay(folder: string): Promise<ReplayNote | undefined> {
  const needed = ['session.json', 'rig.yaml', 'rules.yaml'];
  if (!needed.every((name) => fs.existsSync(path.join(folder, name)))) return undefined;
  const replay = await check(folder);
  updateDescription(folder, { replay });
  return replay;
}

/** A check that could not be made is noted as such: it must not look like one that was passed. */
async function check(folder: string): Promise<ReplayNote> {
  try {
    const { inputs, decisions, commands, difference } = await replaySession(
      folder,
      loadSession(folder).setup,
    );
    const counts = { inputs, decisions, commands };
    if (difference === null) return { identical: true, ...counts };
    return { identical: false, ...counts, difference };
  } catch (error) {
    const failed = (error as Error).message;
    return { identical: false, inputs: 0, decisions: 0, commands: 0, failed };
  }
}
