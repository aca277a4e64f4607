import type { Beat, HostMessageName, MessageOf } from '../wire/messages.js';
import type { SessionSetup } from './core/sessionCore.js';
import { SessionCore } from './core/sessionCore.js';
import type { StampedDecision } from './decisions.js';
import type { SessionDescription } from './description.js';
import { onTheWire } from './record/onTheWire.js';
import { readRecord } from './record/readRecord.js';
import type { RecordState } from './record/recordState.js';
import { waterOf } from './store.js';

/** The first place where a replay and its record say different things. */
export interface Difference {
  /** Sequence number of the input that caused it. */
  readonly input: number;
  readonly recorded: string | null;
  readonly replayed: string | null;
}
export interface ReplayResult {
  readonly inputs: number;
  readonly decisions: number;
  readonly commands: number;
  readonly difference: Difference | null;
  readonly state: RecordState;
  /** What the session gave; what was under way where it never ended is uncertain. */
  readonly water: NonNullable<SessionDescription['water']>;
}

/**
 * Feeds a record's inputs through the engine again and compares every command and decision.
 * @param folder the session folder
 * @param progress called now and then with the number of inputs compared
 */
export async function replaySession(
  folder: string,
  setup: SessionSetup,
  progress?: (inputs: number) => void,
): Promise<ReplayResult> {
  const reader = await readRecord(folder);
  // What the replay has said and the record has not yet confirmed, in order.
  const said: Said[] = [];
  let next = 0;
  let difference: Difference | null = null;
  let decisions = 0;
  let commands = 0;
  let inputs = 0;
  const core: SessionCore = new SessionCore(setup, {
    command: (name, message) => said.push(saidCommand(core.input, name, message)),
    decision: (decision) => said.push({ input: core.input, text: JSON.stringify(decision) }),
  });
  const compare = (theirs: Said) => {
    if (difference !== null) return;
    const mine = said[next++];
    if (mine !== undefined && same(mine, theirs)) return;
    const replayed = mine === undefined ? null : textOf(mine);
    difference = { input: theirs.input, recorded: textOf(theirs), replayed };
  };
  const before = () => {
    // What was said about the last input must all have been found in the record by now.
    if (difference === null && next < said.length) {
      const mine = said[next]!;
      difference = { input: mine.input, recorded: null, replayed: textOf(mine) };
    }
    said.length = 0;
    next = 0;
  };
  const state = reader.visit({
    sample: (_, sample) => {
      inputs++;
      if ((inputs & 0x3fff) === 0) progress?.(inputs);
      if (said.length > 0 || next > 0) before();
      core.sample(sample);
    },
    input: (_, input) => {
      inputs++;
      before();
      core.take(input);
    },
    command: <N extends HostMessageName>(input: number, name: N, message: MessageOf[N]) => {
      commands++;
      compare(saidCommand(input, name, message));
    },
    decision: (decision: StampedDecision) => {
      decisions++;
      compare({ input: decision.input, text: JSON.stringify(decision) });
    },
  });
  return { inputs, decisions, commands, difference, state, water: waterAtEnd(core) };
}

/** Of a session that its record leaves running too: nobody will say what became of its last drops. */
function waterAtEnd(core: SessionCore): ReplayResult['water'] {
  const reason = 'the record ends here';
  if (core.state === 'running' || core.state === 'ending') core.take({ kind: 'link down', reason });
  if (core.state === 'running')
    core.take({ kind: 'operator', act: { act: 'end', reason }, by: { who: 'replay', from: '' } });
  return waterOf(core);
}

/** One command or decision. A beat comes forty times a second and is kept as its numbers. */
interface Said {
  readonly input: number;
  readonly text: string;
  readonly finishedUs?: number;
  readonly wanted?: number;
}

function saidCommand(input: number, name: HostMessageName, message: object): Said {
  if (name !== 'beat')
    return { input, text: `${name} ${JSON.stringify(onTheWire(name, message))}` };
  const { finishedUs, wanted } = message as Beat;
  return { input, text: 'beat', finishedUs: finishedUs >>> 0, wanted: wanted >>> 0 };
}

function same(a: Said, b: Said): boolean {
  const { input, text, finishedUs, wanted } = b;
  return a.input === input && a.text === text && a.finishedUs === finishedUs && a.wanted === wanted;
}

function textOf({ text, finishedUs, wanted }: Said): string {
  return finishedUs === undefined ? text : `${text} ${JSON.stringify({ finishedUs, wanted })}`;
}
