import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { simulatedRigFor } from '../../server/main/simulatedRigFor.js';
import { packageRoot } from '../../server/packageRoot.js';
import { prepareRules } from '../../server/session/prepare.js';
import { rehearse } from '../../server/session/rehearsal.js';
import { replaySession } from '../../server/session/replay.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { openSession } from '../../server/session/store.js';

export const TEN_RULES = `title: Ten rules for an hour
belt: 180 cm
places:
  zone: 85 to 95 cm
rules:
  water:
    when: reaches 90 cm
    do: give 1 uL
  lap_mark:
    when: lap begins
    do: pulse sync for 10 ms
  light:
    when: reaches 45 cm
    if: speed >= 8 cm/s
    do: pulse laser for 100 ms
    limit: 1 per lap
  third:
    when: 3rd lick in zone this visit
    do: pulse marker for 5 ms
  burst:
    when: 5 licks within 1 s
    if: not in zone
    do: note
    limit: 1 per lap
  still_tone:
    when: still and not in zone for 2 s
    do: pulse tone for 200 ms
    limit: at least 10 s apart
  fast:
    when: speed > 40 cm/s for 500 ms
    do: note
  enters_zone:
    when: enters zone
    do: note
  late:
    when: 2 s after water fires
    do: note
  minute:
    when: every 1 min
    do: note
end: time >= 60 min
`;

export interface RehearsalBench {
  readonly sessionHours: number;
  readonly inputs: number;
  /** Wall time of each run, first to last: the first compiles. */
  readonly rehearsedS: readonly number[];
  readonly replayedS: readonly number[];
  readonly identical: boolean;
}

const ROUNDS = 5;

/** An hour of session with ten rules, its record written, and then that record replayed. */
export async function benchRehearsal(): Promise<RehearsalBench> {
  const folder = mkdtempSync(join(tmpdir(), 'lapwing-bench-'));
  try {
    const rig = readRig(join(packageRoot, 'hardware-sim/demo/rig.yaml'));
    const path = join(folder, 'rules.yaml');
    writeFileSync(path, TEN_RULES);
    const rules = prepareRules(path, rig);
    const seed = 'bench';
    const setup = { rig, program: rules.program, title: rules.file.title, seed, waterTodayNl: 0 };
    const card = { subject: 'b', experimenter: '', seed, startedAt: new Date(), waterTodayNl: 0 };
    const rehearsedS: number[] = [];
    const replayedS: number[] = [];
    let inputs = 0;
    let identical = true;
    for (let round = 0; round < ROUNDS; round++) {
      const virtual = simulatedRigFor(rig, { seed: 1, trained: true });
      const beganMs = performance.now();
      const opened = openSession(folder, rig, rules, card, null, { mode: 'bulk' });
      const runner = rehearse(setup, virtual, { mostUs: 2 * 3.6e9, recorder: opened.recorder });
      opened.recorder.close(runner.core.endReason);
      const rehearsedMs = performance.now();
      const replayed = await replaySession(opened.folder, setup);
      rehearsedS.push((rehearsedMs - beganMs) / 1000);
      replayedS.push((performance.now() - rehearsedMs) / 1000);
      inputs = replayed.inputs;
      identical &&= replayed.difference === null;
      rmSync(opened.folder, { recursive: true });
    }
    return { sessionHours: 1, inputs, rehearsedS, replayedS, identical };
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}
