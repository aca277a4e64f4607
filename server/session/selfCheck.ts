import fs from 'node:fs';
import path from 'node:path';
import { needArm } from './blinding/arms.js';
import { readDescription, type SessionDescription, updateDescription } from './description.js';
import { loadSession } from './loadSession.js';
import { type Difference, replaySession } from './replay.js';

type ReplayNote = NonNullable<SessionDescription['replay']>;

/**
 * Replays a session that has ended and notes in `session.json` whether every decision came out the
 * same; and the water it gave, where its program died before it could say. A folder that holds no copies of its files (a bare record) is left as it is: undefined.
 */
export async function noteReplay(
  folder: string,
  progress: (done: number) => void = () => {},
): Promise<ReplayNote | undefined> {
  const needed = ['session.json', 'rig.yaml', 'rules.yaml'];
  if (!needed.every((name) => fs.existsSync(path.join(folder, name)))) return undefined;
  const { replay, water } = await check(folder, progress);
  const known = water === undefined || readDescription(folder).water !== undefined;
  updateDescription(folder, known ? { replay } : { replay, water });
  return replay;
}

/** A check that could not be made is noted as such: it must not look like one that was passed. */
async function check(folder: string, progress: (done: number) => void) {
  try {
    const { setup, description } = loadSession(folder);
    needArm(description.blinding, setup.arm);
    const most = description.record?.lastInput ?? Number.POSITIVE_INFINITY;
    const { inputs, decisions, commands, difference, water } = await replaySession(
      folder,
      setup,
      (done) => progress(Math.min(1, done / most)),
    );
    const counts = { inputs, decisions, commands };
    const replay: ReplayNote =
      difference === null
        ? { identical: true, ...counts }
        : { identical: false, ...counts, difference: told(difference, description) };
    return { replay, water };
  } catch (error) {
    const failed = (error as Error).message;
    const counts = { inputs: 0, decisions: 0, commands: 0 };
    return { replay: { identical: false, ...counts, failed } satisfies ReplayNote };
  }
}

/** The place alone while an arm is sealed: the words might tell it. */
function told(difference: Difference, { blinding }: SessionDescription): Difference {
  if (blinding === undefined || blinding.opened !== undefined) return difference;
  return { input: difference.input, recorded: null, replayed: null };
}
