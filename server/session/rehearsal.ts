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
  /**
   * For a rig whose board reports more seldom than a real one: asks for a sample once the belt has
   * come so many counts forwards or back, or at a time, at the end of that millisecond.
   */
  lookAt?(upCounts: number, downCounts: number, us: number): void;
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
const NEVER = Number.POSITIVE_INFINITY;

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
  let commanded = false;
  const deliver = () => {
    for (const { name, message } of outbox) rig.receive(name, message, TAG);
    outbox.length = 0;
    commanded = false;
  };
  const reentrant = rig.reentrant === true;
  const stepUs = reentrant ? REENTRANT_STEP_US : STEP_US;
  const runner = new SessionRunner(
    setup,
    (name, message) => {
      outbox.push({ name, message });
      if (name !== 'beat') commanded = true;
    },
    options.recorder,
    options.onDecision,
  );
  shakeHands(
    rig,
    runner,
    () => {
      if (reentrant && outbox.length > 0) deliver();
    },
    rig.lookAt === undefined ? () => {} : (soon) => lookAhead(rig, runner, soon || commanded),
  );
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

/**
 * @param before called before each frame is taken
 * @param after called after it; `soon` for a message that was no sample, since what it did to inputs
 *   and outputs shows in the next one
 */
function shakeHands(
  rig: VirtualRig,
  runner: SessionRunner,
  before: () => void,
  after: (soon: boolean) => void,
): void {
  let answered: Identity | undefined;
  const take = (input: RareInput) => {
    before();
    if (runner.core.state !== 'ended') runner.take(input);
    after(true);
  };
  rig.connect({
    identity: (message) => {
      answered = { ...message };
    },
    sample: (message) => {
      before();
      if (runner.core.state !== 'ended') runner.sample(message);
      after(false);
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

/**
 * Has a board that reports seldom report where rules wait for something, as one that looks every
 * millisecond would: at places, at the lap's end, when delays run out.
 * @param soon at the end of this millisecond anyway
 */
function lookAhead(rig: VirtualRig, { core }: SessionRunner, soon: boolean): void {
  const { engine, instant } = core;
  const travel = instant.travelTo;
  if (!instant.placed) {
    rig.lookAt!(NEVER, NEVER, soon ? 0 : engine.nextTimerUs);
    return;
  }
  const lapEnd = (instant.lap + 1) * instant.lapCounts;
  const up = Math.ceil(Math.min(engine.nextAhead, lapEnd) - travel);
  const down = Math.floor(travel - engine.nextBehind) + 1;
  rig.lookAt!(up, down, soon ? 0 : engine.nextTimerUs);
}

function endIt(runner: SessionRunner, over: boolean, mostUs: number): void {
  const reason = over
    ? `it had not ended by itself after ${mostUs / MINUTE_US} minutes`
    : 'the rehearsal was stopped';
  const by = { who: 'the rehearsal', from: 'this computer' };
  runner.take({ kind: 'operator', act: { act: 'end', reason }, by });
}
