import type { AnimalParameters } from '../../hardware-sim/animal/parameters.js';
import type { EdgeSeen, SessionData } from '../../server/analysis/readSession.js';
import { SampleColumns } from '../../server/analysis/sampleColumns.js';
import { simulatedRigFor } from '../../server/main/simulatedRigFor.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import { rehearse } from '../../server/session/rehearsal.js';
import type { SessionRecorder, SessionRunner } from '../../server/session/runner.js';
import { demoRig, setupOf } from '../session/rehearsed.js';

const WATER = `title: water
belt: 180 cm
rules:
  water:
    when: reaches 90 cm
    do: give 3 uL
`;

export interface SimulatedSession {
  readonly subject: string;
  readonly seed: number;
  readonly trained: boolean;
  readonly minutes: number;
  readonly animal: AnimalParameters;
}

/** What `readSession` would give of a simulated session's record, without writing one. */
export function simulatedSession(wanted: SimulatedSession): SessionData {
  const { subject, seed, trained, minutes, animal } = wanted;
  const samples = new SampleColumns();
  const edges: EdgeSeen[] = [];
  const decisions: StampedDecision[] = [];
  let runner: SessionRunner | undefined;
  const recorder: SessionRecorder = {
    sample: (input, message) => samples.push(input, runner!.core.instant, message),
    input: (_, what) => {
      if (what.kind !== 'edge') return;
      const { boardUs, input, level, count } = what.message;
      const name = demoRig.inputs.find(({ line }) => line === input)?.name ?? `input ${input}`;
      edges.push({ boardUs, name, level, count, input: 0 } as EdgeSeen);
    },
    command: () => {},
    decision: (decision) => decisions.push(decision),
    batchEnd: () => {},
  };
  const rig = simulatedRigFor(demoRig, { seed, trained, animal }, true);
  rehearse(setupOf(WATER), rig, {
    mostUs: minutes * 60e6,
    recorder,
    began: (begun) => {
      runner = begun;
    },
  });
  const began = decisions.find(({ kind }) => kind === 'session began')!;
  return {
    ...{ rig: demoRig, samples, edges, decisions },
    ...{ beganUs: began.boardUs, endedUs: decisions.at(-1)!.boardUs },
    description: { name: `${subject} ${seed}`, subject },
  } as unknown as SessionData;
}
