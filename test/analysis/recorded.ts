import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import type { SimulatedRigOptions } from '../../hardware-sim/simulatedRig.js';
import { packageRoot } from '../../server/packageRoot.js';
import type { Blinding } from '../../server/session/blinding/arms.js';
import { rfc3339, updateDescription } from '../../server/session/description.js';
import type { OperatorAct } from '../../server/session/inputs.js';
import { prepareRules } from '../../server/session/prepare.js';
import { rehearse } from '../../server/session/rehearsal.js';
import { readRig } from '../../server/session/rig/readRig.js';
import type { SessionRunner } from '../../server/session/runner.js';
import { openSession } from '../../server/session/store.js';
import { scratchFolder, virtualRig } from '../session/rehearsed.js';

export interface RecordedOptions {
  /** A file of the demo's sessions, or the text of a rules file. */
  readonly rules?: string;
  readonly minutes?: number;
  readonly seed?: string;
  readonly simulated?: SimulatedRigOptions;
  /** Extra text at the end of the demo's rig file. */
  readonly rigExtra?: string;
  /** What an operator does at the end of each minute of session. */
  readonly acts?: readonly OperatorAct[];
  /** Of rules with a sealed draw: what is kept of it, and what it is. */
  readonly blinding?: Blinding;
  readonly arm?: string;
}

const demoFolder = join(packageRoot, 'hardware-sim/demo');

/** A real session folder: the demo's rig, rehearsed in virtual time, with everything recorded. */
export function recordedSession(options: RecordedOptions = {}) {
  const { rules = 'demo.yaml', minutes = 6, seed = 'a seed', simulated, acts = [] } = options;
  const where = scratchFolder();
  const rig = readRig(join(demoFolder, 'rig.yaml'));
  const withExtra = join(where.folder, 'own-rig.yaml');
  writeFileSync(withExtra, rig.text + (options.rigExtra ?? ''));
  const ownRig = readRig(withExtra);
  let file = join(demoFolder, 'sessions', rules);
  if (rules.includes('\n')) {
    file = join(where.folder, 'own.yaml');
    writeFileSync(file, rules);
  }
  const prepared = prepareRules(file, ownRig);
  const startedAt = new Date('2026-03-04T09:30:00.250Z');
  const sealed = options.blinding === undefined ? {} : { blinding: options.blinding };
  const card = {
    ...{ subject: 'm07', experimenter: 'A. Person', seed, startedAt, waterTodayNl: 0 },
    ...sealed,
  };
  const { folder, recorder } = openSession(where.folder, ownRig, prepared, card, null, {
    mode: 'bulk',
  });
  const setup = {
    ...{ rig: ownRig, program: prepared.program, title: prepared.file.title },
    ...{ seed, waterTodayNl: 0 },
    ...(options.arm === undefined ? {} : { arm: options.arm }),
  };
  let minute = 0;
  const acting: { runner?: SessionRunner } = {};
  const runner = rehearse(setup, virtualRig(simulated), {
    mostUs: minutes * 60_000_000,
    recorder: {
      sample: (input, message) => recorder.sample(input, message),
      input: (input, what) => recorder.input(input, what),
      command: (input, name, message) => recorder.command(input, name, message),
      decision: (decision) => recorder.decision(decision),
      batchEnd: (commanded) => recorder.batchEnd(commanded),
    },
    began: (running) => {
      acting.runner = running;
    },
    progress: () => {
      const act = acts[minute++];
      if (act !== undefined)
        acting.runner!.take({ kind: 'operator', act, by: { who: 'tester', from: 'here' } });
      return false;
    },
  });
  recorder.close(runner.core.endReason);
  updateDescription(folder, {
    ended: { how: 'rules', at: rfc3339(startedAt), reason: runner.core.endReason },
  });
  return { folder, root: where.folder, core: runner.core, remove: where.remove };
}
