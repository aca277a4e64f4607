import type { BoardMessageName, HostMessageName, Identity, MessageOf } from '../wire/messages.js';
import { SessionCore } from './core/sessionCore.js';
import type { StampedDecision } from './decisions.js';
import type { RareInput } from './inputs.js';
import type { LoadedSession } from './loadSession.js';
import { readRecord } from './record/readRecord.js';

/** A board that is led along a recorded belt; it answers the commands that other rules send. */
export interface LedBoard {
  /** The belt is at `count` when the board's clock shows `boardUs` (both 32 bits). */
  follow(boardUs: number, count: number): void;
  receive<N extends HostMessageName>(name: N, message: MessageOf[N]): void;
  /** A new connection, as `identity` in the record began it; what the board says to it. */
  connect(identity: Identity, sameBoot: boolean): Identity;
}
export type Hear = <N extends BoardMessageName>(name: N, message: MessageOf[N]) => void;

/** One firing of one output (or one sham), as it was or as it would have been. */
export interface FiringSeen {
  readonly timeS: number;
  readonly positionCm: number | null;
  readonly placeCm: number | null;
  readonly sham: boolean;
}
export type Verdict = 'same' | 'moved' | 'other draw' | 'only recorded' | 'only with other rules';
export interface FiringCompared {
  readonly rule: string;
  readonly output: string | null;
  readonly lap: number;
  readonly recorded: FiringSeen | null;
  readonly other: FiringSeen | null;
  readonly verdict: Verdict;
  /** Why the other rules did not fire, where they said so on that lap. */
  readonly reason: string | null;
}
export interface WhatIf {
  readonly rows: readonly FiringCompared[];
  readonly counts: Readonly<Record<Verdict, number>>;
}

/** Two rises this close are the same firing: a live host's reply can take some milliseconds. */
const SAME_US = 20_000;

/**
 * What another rules file would have done on a session's own belt: its movement, licks, inputs and
 * operator acts are fed to the engine with the other rules, and a board led along the recorded belt
 * answers what those rules command. What the animal would have done otherwise nobody can know.
 * @param other the session loaded with the other rules file
 * @param progress called now and then with the number of inputs fed
 */
export async function whatIf(
  other: LoadedSession,
  makeBoard: (hear: Hear) => LedBoard,
  progress?: (inputs: number) => void,
): Promise<WhatIf> {
  const reader = await readRecord(other.folder);
  const recorded = new Gathered();
  const would = new Gathered();
  const answers: RareInput[] = [];
  const board = makeBoard((name, message) => {
    if (name === 'outcome')
      answers.push({ kind: 'outcome', message: { ...message } as MessageOf['outcome'] });
  });
  let over = false;
  const core: SessionCore = new SessionCore(other.setup, {
    command: (name, message) => board.receive(name, message),
    decision: (decision) => would.take(decision),
  });
  const answer = () => {
    for (let i = 0; i < answers.length; i++) core.take(answers[i]!);
    answers.length = 0;
  };
  reader.visit({
    sample: (number, sample) => {
      if ((number & 0x3fff) === 0) progress?.(number);
      if (over) return;
      board.follow(sample.boardUs, sample.count);
      answer();
      core.sample(sample);
      answer();
    },
    input: (_, input) => {
      // What became of the recorded commands says nothing of those that these rules send.
      if (over || input.kind === 'outcome') return;
      if (input.kind === 'edge') board.follow(input.message.boardUs, input.message.count);
      answer();
      if (input.kind === 'link up')
        core.take({ ...input, identity: board.connect(input.identity, input.sameBoot) });
      else core.take(input);
      answer();
      over = core.state === 'ended';
    },
    decision: (decision) => recorded.take(decision),
  });
  return compare(recorded, would);
}

/** The firings of one course of a session, by rule, output and lap. */
class Gathered {
  readonly firings = new Map<string, FiringSeen[]>();
  readonly reasons = new Map<string, string>();
  #beganUs = 0;

  take(decision: StampedDecision): void {
    const { kind, boardUs, lap } = decision;
    if (kind === 'session began') this.#beganUs = boardUs;
    if (kind === 'fired') {
      const { rule, output, riseUs, riseCm, positionCm, placeCm, sham } = decision;
      const timeS = ((riseUs ?? boardUs) - this.#beganUs) / 1e6;
      const key = JSON.stringify([rule, output, lap]);
      const seen = this.firings.get(key) ?? [];
      seen.push({ timeS, positionCm: riseCm ?? positionCm, placeCm, sham });
      this.firings.set(key, seen);
    } else if (kind === 'withheld' || kind === 'missed' || kind === 'refused') {
      this.reasons.set(`${decision.rule} ${lap}`, `${kind}: ${decision.reason}`);
    }
  }
}

/** Pairs the firings of a rule on a lap in their order; a sham drives no output, and is paired too. */
function compare(recorded: Gathered, other: Gathered): WhatIf {
  const rows: FiringCompared[] = [];
  const keys = new Set([...recorded.firings.keys(), ...other.firings.keys()]);
  for (const key of keys) {
    const [rule, output, lap] = JSON.parse(key) as [string, string | null, number];
    const theirs = recorded.firings.get(key) ?? [];
    const ours = other.firings.get(key) ?? [];
    for (let i = 0; i < Math.max(theirs.length, ours.length); i++) {
      const was = theirs[i] ?? null;
      const would = ours[i] ?? null;
      const reason = would === null ? (other.reasons.get(`${rule} ${lap}`) ?? null) : null;
      const verdict = verdictOf(was, would);
      rows.push({ rule, output, lap, recorded: was, other: would, verdict, reason });
    }
  }
  const when = (row: FiringCompared) => (row.recorded ?? row.other)!.timeS;
  rows.sort((a, b) => when(a) - when(b));
  const counts: Record<Verdict, number> = {
    ...{ same: 0, moved: 0, 'other draw': 0, 'only recorded': 0, 'only with other rules': 0 },
  };
  for (const { verdict } of rows) counts[verdict]++;
  return { rows, counts };
}

function verdictOf(was: FiringSeen | null, would: FiringSeen | null): Verdict {
  if (was === null) return 'only with other rules';
  if (would === null) return 'only recorded';
  if (was.sham !== would.sham) return 'other draw';
  return Math.abs(was.timeS - would.timeS) * 1e6 <= SAME_US ? 'same' : 'moved';
}
