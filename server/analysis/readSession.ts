import { LapwingError } from '../errors/codes.js';
import { SessionCore } from '../session/core/sessionCore.js';
import type { StampedDecision } from '../session/decisions.js';
import { type LoadedSession, loadSession } from '../session/loadSession.js';
import { readRecord } from '../session/record/readRecord.js';
import type { RecordState } from '../session/record/recordState.js';
import { type Arm, type Edge, type Pulse, SYNC_EDGE } from '../wire/messages.js';
import { extend32 } from '../wire/time.js';
import { hideArmIn } from './hideArm.js';
import type { PulseShape } from './pulses.js';
import { SampleColumns } from './sampleColumns.js';

/** A change of an input, or of the output that a sync train moves, at the board's own stamp. */
export interface EdgeSeen {
  /** Number of the engine input that it was. */
  readonly input: number;
  readonly boardUs: number;
  readonly name: string;
  readonly level: number;
  readonly count: number;
}

/** Everything that a session's record holds, with the belt's place at every sample. */
export interface SessionData extends LoadedSession {
  readonly state: RecordState;
  /** Extended board time of the beginning (time zero of every table) and of the end. */
  readonly beganUs: number;
  readonly endedUs: number;
  readonly samples: SampleColumns;
  readonly edges: readonly EdgeSeen[];
  /** What was commanded, by command id. */
  readonly shapes: ReadonlyMap<number, PulseShape>;
  /** As recorded. */
  readonly decisions: readonly StampedDecision[];
}

/**
 * Reads a record and feeds its inputs through the engine again, which gives position, speed and lap
 * at each sample; decisions and edges are those that were recorded,
 * without what would show the arm of a session that is sealed still.
 * @param progress called with the share read, 0 to 1, of a record that has been finished
 * @throws LapwingError RECORD_NO_SESSION where the record holds no beginning of a session
 */
export async function readSession(
  folder: string,
  progress: (done: number) => void = () => {},
): Promise<SessionData> {
  const loaded = loadSession(folder);
  const { rig } = loaded;
  const reader = await readRecord(folder);
  const samples = new SampleColumns();
  const edges: EdgeSeen[] = [];
  const shapes = new Map<number, PulseShape>();
  const decisions: StampedDecision[] = [];
  const core = new SessionCore(loaded.setup, { command: () => {}, decision: () => {} });
  const nameOfOutput = (output: number) =>
    rig.outputs.find(({ line }) => line === output)?.name ?? `output ${output}`;
  const nameOfLine = (input: number) => {
    if ((input & SYNC_EDGE) === 0)
      return rig.inputs.find(({ line }) => line === input)?.name ?? `input ${input}`;
    return nameOfOutput(input & ~SYNC_EDGE);
  };
  const edge = (input: number, message: Edge) => {
    // The stamp of an edge that a later frame overtook is a little before the instant's time.
    const nowUs = core.instant.nowUs;
    const onBoardUs = core.tracker.toBoardUs(nowUs);
    const boardUs = extend32(onBoardUs, message.boardUs) - onBoardUs + nowUs;
    const { level, count } = message;
    edges.push({ input, boardUs, name: nameOfLine(message.input), level, count });
  };
  const inputs = loaded.description.record?.lastInput ?? 0;
  const state = reader.visit({
    sample: (input, sample) => {
      core.sample(sample);
      samples.push(input, core.instant, sample);
      if ((samples.length & 0x3fff) === 0 && inputs > 0) progress(Math.min(1, input / inputs));
    },
    input: (number, input) => {
      core.take(input);
      if (input.kind === 'edge') edge(number, input.message);
    },
    command: (_, name, message) => {
      if (name !== 'pulse' && name !== 'arm') return;
      const { id, output, widthUs, periodUs, repeats } = message as Pulse | Arm;
      shapes.set(id, { output: nameOfOutput(output), widthUs, periodUs, repeats });
    },
    decision: (decision) => decisions.push(decision),
  });
  const shown = hideArmIn(loaded, { samples, edges, shapes, decisions });
  const began = decisions.find(({ kind }) => kind === 'session began');
  if (began === undefined)
    throw new LapwingError('recordNoSession', `${folder}: no session begins in its record.`);
  const ended = decisions.findLast(({ kind }) => kind === 'session ended');
  const endedUs = ended?.boardUs ?? core.instant.nowUs;
  return {
    ...{ ...loaded, state, beganUs: began.boardUs, endedUs },
    ...shown,
  };
}
