import { join } from 'node:path';
import { armOf, needArm } from '../session/blinding/arms.js';
import { readDescription } from '../session/description.js';
import { prepareRules } from '../session/prepare.js';
import { readRecord } from '../session/record/readRecord.js';
import { Recorder, type RecorderOptions } from '../session/record/recorder.js';
import type { Rig } from '../session/rig/rig.js';
import type { SessionRunner } from '../session/runner.js';
import { recordHeaderOf } from '../session/store.js';
import type { Identity } from '../wire/messages.js';
import type { CurrentSession } from './currentSession.js';
import type { RunningSession } from './view.js';

/**
 * The session that a loop which died was running, by the rules and the arm it began with.
 * @throws LapwingError what is wrong with the rules, or BLINDING_ where its arm is not to be had
 */
export function sessionLeft(current: CurrentSession, rig: Rig): RunningSession {
  const { folder } = current;
  const rules = prepareRules(join(folder, 'rules.yaml'), rig);
  const { blinding } = readDescription(folder);
  const arm = armOf(blinding);
  needArm(blinding, arm);
  const sealed = arm === undefined ? {} : { arm };
  return { ...current, rules, ...sealed, startedAt: new Date(current.startedAt) };
}

/**
 * Brings a new runner to where the record ends; what it goes on with is recorded in the same folder.
 * Every board that had answered is told to `known`, the last one last.
 */
export async function replayRecord(
  folder: string,
  runner: SessionRunner,
  known: (identity: Identity) => void,
  onTrouble: NonNullable<RecorderOptions['onTrouble']>,
): Promise<Recorder> {
  const reader = await readRecord(folder);
  runner.replay(() =>
    reader.visit({
      sample: (_, sample) => runner.sample(sample),
      input: (_, input) => {
        if (input.kind === 'link up') known(input.identity);
        runner.take(input);
      },
    }),
  );
  const resume = reader.resumePoint();
  const recorder = Recorder.create(folder, recordHeaderOf(folder), { onTrouble, resume });
  runner.recordTo(recorder);
  return recorder;
}
