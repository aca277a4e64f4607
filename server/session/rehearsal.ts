import type { BoardMessageName, HostMessageName, Identity, MessageOf } from '../wire/messages.js';
import { PROTOCOL_VERSION } from '../wire/messages.js';
import type { SessionSetup } from './core/sessionCore.js';
import type { StampedDecision } from './decisions.js';
import type { RareInput } from './inputs.js';
import { type SessionRecorder, SessionRunner } from './runner.js';

/** Told a board's messages; each is reused by the board. */
export type BoardListener = {
  [N in BoardMessageName]: (message: MessageOf[N], tag: number) => void;
};

/** A rig on a clock of its own, that only `advanceTo` moves. */
export interface VirtualRig {
  /** Microseconds since the rig was switched on. */
  readonly nowUs: number;
  /** It may be told commands from within a listener, and acts on them after the event at hand. */
  readonly reentrant?: boolean;
  advanceTo(us: number): void;
  connect(listener: BoardListener): void;
  receive<N extends HostMessageName>(name: N, message: MessageOf[N], tag: number): void;
}

export interface RehearsalOptions {
  /** A session that does not end by itself is ended after this long. */
  readonly mostUs: number;
  readonly recorder?: SessionRecorder;
  readonly onDecision?: (decision: StampedDecision) => void;
  /** Given the runner before the first instant, for whoever would act as the operator. */
  readonly began?: (runner: SessionRunner) => void;
  /** Called about every virtual minute; true ends the session as the operator would. */
  readonly progress?: (sessionUs: number) => boolean;
}

const TAG = 1;
/** What the host sends reaches the board at the end of the same millisecond, */
const STEP_US = 1_000;
/**
 * or with the next frame (1 ms later while the belt moves, 5 ms at most), where the rig can be told
 * then: a third less work, since the rig may run on by itself in between.
 */
const REENTRANT_STEP_US = 1_000_000;
const MINUTE_US = 60_000_000;

/**
 * Runs a whole session on a simulated rig in virtual time, with the code that runs a live one: the
 * link alone is left out, and its bytes.
 */
export function rehearse(
  setup: SessionSetup,
  rig: VirtualRig,
  options: RehearsalOptions,
): SessionRunner {
  const outbox: { name: HostMessageName; message: MessageOf[HostMessageName] }[] = [];
  const deliver = () => {
    for (const { name, message } of outbox) rig.receive(name, message, TAG);
    outbox.length = 0;
  };
  const reentrant = rig.reentrant === true;
  const stepUs = reentrant ? REENTRANT_STEP_US : STEP_US;
  const runner = new SessionRunner(
    setup,
    (name, message) => outbox.push({ name, message }),
    options.recorder,
    options.onDecision,
  );
  shakeHands(rig, runner, () => {
    if (reentrant && outbox.length > 0) deliver();
  });
  options.began?.(runner);
  const beganUs = rig.nowUs;
  let minuteUs = beganUs + MINUTE_US;
  let untilUs = beganUs;
  const { core } = runner;
  while (core.state !== 'ended') {
    if (outbox.length > 0) deliver();
    untilUs += stepUs;
    rig.advanceTo(untilUs);
    if (untilUs < minuteUs) continue;
    minuteUs += MINUTE_US;
    const over = untilUs - beganUs >= options.mostUs;
    if (options.progress?.(untilUs - beganUs) || over) endIt(runner, over, options.mostUs);
  }
  return runner;
}

/** @param before called before each frame is taken */
function shakeHands(rig: VirtualRig, runner: SessionRunner, before: () => void): void {
  let answered: Identity | undefined;
  const take = (input: RareInput) => {
    before();
    if (runner.core.state !== 'ended') runner.take(input);
  };
  rig.connect({
    identity: (message) => {
      answered = { ...message };
    },
    sample: (message) => {
      before();
      if (runner.core.state !== 'ended') runner.sample(message);
    },
    edge: (message) => take({ kind: 'edge', message }),
    outcome: (message) => take({ kind: 'outcome', message }),
    fault: (message) => take({ kind: 'fault', message }),
    clock: (message) => take({ kind: 'clock', message }),
  });
  rig.receive('identify', { nonce: 1, protocol: PROTOCOL_VERSION, newTag: TAG }, 0);
  if (answered === undefined) throw new Error('the simulated board did not answer');
  const identity = answered;
  runner.take({ kind: 'link up', identity, tag: TAG, sameBoot: false, overNetwork: false });
  runner.take({ kind: 'begin', firstId: 1 });
}

function endIt(runner: SessionRunner, over: boolean, mostUs: number): void {
  const reason = over
    ? `it had not ended by itself after ${mostUs / MINUTE_US} minutes`
    : 'the rehearsal was stopped';
  const by = { who: 'the rehearsal', from: 'this computer' };
  runner.take({ kind: 'operator', act: { act: 'end', reason }, by });
}
