import type { HostMessageName, MessageOf } from '../wire/messages.js';
import type { SessionSetup } from './core/sessionCore.js';
import { SessionCore } from './core/sessionCore.js';
import type { StampedDecision } from './decisions.js';
import { onTheWire } from './record/onTheWire.js';
import { readRecord } from './record/readRecord.js';
import type { RecordState } from './record/recordState.js';

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
}

/**
 * Feeds a record's inputs through the engine again and compares every command and decision.
 * @param folder the session folder
 */
export async function replaySession(folder: string, setup: SessionSetup): Promise<ReplayResult> {
  const reader = await readRecord(folder);
  // What the replay has said and the record has not yet confirmed, in order.
  const said: { input: number; text: string }[] = [];
  let next = 0;
  let difference: Difference | null = null;
  let decisions = 0;
  let commands = 0;
  let inputs = 0;
  const core: SessionCore = new SessionCore(setup, {
    command: (name, message) => said.push({ input: core.input, text: commandText(name, message) }),
    decision: (decision) => said.push({ input: core.input, text: JSON.stringify(decision) }),
  });
  const compare = (input: number, text: string) => {
    if (difference !== null) return;
    const mine = said[next++];
    if (mine?.input === input && mine.text === text) return;
    difference = { input, recorded: text, replayed: mine?.text ?? null };
  };
  const before = () => {
    // What was said about the last input must all have been found in the record by now.
    if (difference === null && next < said.length) {
      const { input, text } = said[next]!;
      difference = { input, recorded: null, replayed: text };
    }
    said.length = 0;
    next = 0;
    inputs++;
  };
  const state = reader.visit({
    sample: (_, sample) => {
      if (said.length > 0 || next > 0) before();
      else inputs++;
      core.sample(sample);
    },
    input: (_, input) => {
      before();
      core.take(input);
    },
    command: <N extends HostMessageName>(input: number, name: N, message: MessageOf[N]) => {
      commands++;
      compare(input, commandText(name, message));
    },
    decision: (decision: StampedDecision) => {
      decisions++;
      compare(decision.input, JSON.stringify(decision));
    },
  });
  return { inputs, decisions, commands, difference, state };
}

function commandText(name: HostMessageName, message: object): string {
  return `${name} ${JSON.stringify(onTheWire(name, message))}`;
}
