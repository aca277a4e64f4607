import { rmSync } from 'node:fs';
import type { Logger } from 'pino';
import { LapwingError } from '../errors/codes.js';
import { LiveMask } from '../session/blinding/liveMask.js';
import type { SessionSetup } from '../session/core/sessionCore.js';
import type { StampedDecision } from '../session/decisions.js';
import type { Actor, OperatorAct, RareInput } from '../session/inputs.js';
import { idleRules, newSeed, type PreparedRules, prepareRules } from '../session/prepare.js';
import { finish } from '../session/record/finish.js';
import type { Recorder } from '../session/record/recorder.js';
import type { TroubleKind } from '../session/record/segmentLog.js';
import type { Rig } from '../session/rig/rig.js';
import { SessionRunner } from '../session/runner.js';
import { describeEnd, openSession } from '../session/store.js';
import type { Sample } from '../wire/messages.js';
import type { AlarmWatch } from './alarms/alarmWatch.js';
import type { StallWatch } from './alarms/stallWatch.js';
import { preflightOverride, sealedArm } from './beginChecks.js';
import type { Bench } from './bench.js';
import { type Board, frames } from './board.js';
import type { BookTalk } from './bookTalk.js';
import { checkAct } from './checkAct.js';
import { type CurrentSession, keepCurrent } from './currentSession.js';
import type { EventRing } from './eventRing.js';
import { LiveRecord } from './liveRecord.js';
import type { BeginOptions } from './options.js';
import { replayRecord, sessionLeft } from './resume.js';
import type { RunningSession } from './view.js';

/** What the sessions of a rig need of the rest of its loop. */
export interface SessionsHost {
  readonly board: Board;
  readonly bench: Bench;
  readonly book: BookTalk;
  readonly events: EventRing;
  readonly alarms: AlarmWatch;
  readonly stalls: StallWatch;
  readonly log: Logger;
  readonly recordFolder: string;
  /** Where a loop that is started after a crash finds which session ran. */
  readonly currentFile: string;
  began(folder: string): void;
  ended(folder: string, reason: string): void;
  /** The ended session's record is finished and the water book told. */
  closed(): void;
}

/**
 * One session after another on one rig, and what runs between them: rules that do nothing, or the
 * bench. Whatever runs gets every frame, rare input and act from here.
 */
export class Sessions {
  readonly record: LiveRecord;
  readonly #host: SessionsHost;
  readonly #board: Board;
  readonly #log: Logger;
  #rig: Rig;
  #runner: SessionRunner;
  #mask: LiveMask | undefined;
  #session: RunningSession | undefined;
  #ended: string | null = null;
  #beginning = false;
  #closing: Promise<void> = Promise.resolve();

  constructor(rig: Rig, host: SessionsHost) {
    this.#rig = rig;
    this.#host = host;
    this.#board = host.board;
    this.#log = host.log;
    this.record = new LiveRecord(host.recordFolder, (kind, error) => this.#trouble(kind, error));
    this.#runner = this.#idleRunner();
  }

  get rig(): Rig {
    return this.#rig;
  }
  get runner(): SessionRunner {
    return this.#runner;
  }
  /** The session that runs. */
  get session(): RunningSession | undefined {
    return this.#session;
  }
  /** While a blinded session runs: what may be shown of it. */
  get mask(): LiveMask | undefined {
    return this.#mask;
  }
  /** Why the last session ended; null while one runs, or before the first. */
  get endedBecause(): string | null {
    return this.#ended;
  }
  /** A session runs or is about to. */
  get busy(): boolean {
    return this.#session !== undefined || this.#beginning;
  }
  /** Settles when the last session's record is finished and the water book told. */
  get closing(): Promise<void> {
    return this.#closing;
  }

  // ---- what comes in -------------------------------------------------------------------------

  sample(message: Sample): void {
    this.#runner.sample(message);
  }

  take(input: RareInput): void {
    this.#runner.take(input);
  }

  /** @throws LapwingError LOOP_BAD_ACT and others, where the act does not fit what runs */
  act(act: OperatorAct, by: Actor): void {
    checkAct(act, this.#runner.core, this.#session?.rules);
    this.take({ kind: 'operator', act, by });
    this.batchEnd();
  }

  batchEnd(): void {
    this.#runner.batchEnd();
    if (this.#session !== undefined && this.#runner.core.state === 'ended') {
      this.#end(this.#runner.core.endedBy);
    }
  }

  /** The loop's own tick. */
  tick(nowMs: number): void {
    this.record.tick(nowMs);
    this.#mask?.tick(this.#runner.core.instant.nowUs);
  }

  // ---- between sessions ----------------------------------------------------------------------

  /** The rig file was read again. */
  useRig(rig: Rig): void {
    this.#rig = rig;
    this.goIdle();
  }

  goIdle(): void {
    this.#runner = this.#idleRunner();
    this.#takeLinkUp();
  }

  /** The bench's runner takes the board's frames from now on. */
  runBench(runner: SessionRunner): void {
    this.#runner = runner;
    this.#takeLinkUp();
    this.take({ kind: 'begin', firstId: this.#board.nextFirstId });
  }

  #idleRunner(): SessionRunner {
    const rules = idleRules(this.#rig);
    return new SessionRunner(
      { rig: this.#rig, program: rules, title: '', seed: '', waterTodayNl: 0 },
      this.#board.send,
      undefined,
      (decision) => this.#host.alarms.hear(decision),
    );
  }

  /** A new runner is told of the board that answers. */
  #takeLinkUp(): void {
    const up = this.#board.linkUp();
    if (up !== undefined) this.take(up);
  }

  // ---- a session -----------------------------------------------------------------------------

  /**
   * Begins a session. What takes long (compiling, syncing files) is done in steps, and frames are
   * taken in between, so that the board never misses a beat.
   * @throws LapwingError LOOP_BUSY, LOOP_NO_BOARD, or what the rules, the pre-flight, the animals
   *   folder or the sealed arms have against it
   */
  async begin(begin: BeginOptions, prepared?: PreparedRules): Promise<void> {
    if (this.busy) throw new LapwingError('loopBusy', 'End it before another begins.');
    this.#beginning = true;
    const { bench, book, recordFolder } = this.#host;
    const { link } = this.#board;
    try {
      bench.close('a session begins');
      const rules = prepared ?? prepareRules(begin.rulesPath, this.#rig);
      await frames();
      const { rulesPath: _, ...who } = begin;
      const seed = begin.seed ?? newSeed();
      if (link.identity === undefined) await this.#board.untilUp();
      const override = preflightOverride(this.#rig, link.identity, begin.despite);
      const known = await book.before(who.subject, begin.despite);
      const arm = sealedArm(rules, this.#rig, recordFolder, who);
      const startedAt = new Date();
      const card = { ...who, seed, startedAt, ...known, ...arm, ...override };
      await frames();
      const board = link.identity ?? null;
      const opened = openSession(recordFolder, this.#rig, rules, card, board, {
        onTrouble: (kind, error) => this.#trouble(kind, error),
      });
      await this.#board.untilUp();
      this.#start({ folder: opened.folder, rules, ...card }, opened.recorder);
      book.began(opened.folder, who.subject, known.animal);
    } finally {
      this.#beginning = false;
    }
  }

  #start(session: RunningSession, recorder: Recorder): void {
    const up = this.#board.linkUp();
    if (up === undefined) {
      recorder.close('the board was gone before the session began');
      throw new LapwingError('loopNoBoard', 'The board does not answer.');
    }
    const { folder } = session;
    keepCurrent(this.#host.currentFile, session);
    this.record.recorder = recorder;
    this.#session = session;
    this.#mask = this.#maskFor(session.rules);
    this.#ended = null;
    this.#host.stalls.restart();
    this.#runner = new SessionRunner(
      setupFor(this.#rig, session),
      this.#board.send,
      recorder,
      this.#onDecision,
    );
    this.take(up);
    this.take({ kind: 'begin', firstId: this.#board.nextFirstId });
    this.batchEnd();
    this.#log.info({ folder }, 'session begun');
    this.#host.began(folder);
  }

  /** Takes up the session that a loop which died was running, from its record. */
  async resume(current: CurrentSession): Promise<void> {
    const { folder } = current;
    const session = sessionLeft(current, this.#rig);
    this.#mask = this.#maskFor(session.rules);
    const setup = setupFor(this.#rig, session);
    const runner = new SessionRunner(setup, this.#board.send, undefined, this.#onDecision);
    const recorder = await replayRecord(
      folder,
      runner,
      // So that the link can tell whether the board has been on all the while.
      (identity) => this.#board.link.remember(identity),
      (kind, error) => this.#trouble(kind, error),
    );
    this.#runner = runner;
    this.#session = session;
    this.record.recorder = recorder;
    this.take({ kind: 'link down', reason: 'the loop was restarted' });
    this.take({ kind: 'resume', note: 'what was recorded has been replayed' });
    this.#log.warn({ folder, inputs: runner.core.input }, 'session resumed');
    if (runner.core.state === 'ended') this.#end(runner.core.endedBy);
  }

  #end(how: 'rules' | 'operator' | 'signal'): void {
    const { folder } = this.#session!;
    const { core } = this.#runner;
    this.#session = undefined;
    this.#mask?.flush();
    this.#mask = undefined;
    this.#ended = core.endReason;
    const whole = this.record.recorder?.close(core.endReason) ?? false;
    this.record.recorder = undefined;
    try {
      describeEnd(folder, core, how);
    } catch (error) {
      this.#log.error({ error, folder }, 'the description could not be brought up to date');
    }
    rmSync(this.#host.currentFile, { force: true });
    this.goIdle();
    this.#log.info({ folder, reason: core.endReason }, 'session ended');
    this.#host.ended(folder, core.endReason);
    if (whole) {
      // The record is whole without it, so a failure is told and nothing more.
      this.#closing = finish(folder).then(
        () => {},
        (error: Error) => this.#log.error({ folder }, error.message),
      );
    }
    this.#closing = this.#closing.then(() => this.#host.book.ended(folder));
    void this.#closing.then(() => this.#host.closed());
  }

  #maskFor({ program }: PreparedRules): LiveMask | undefined {
    const { events } = this.#host;
    return program.sealed && new LiveMask(program.sealed, (decision) => events.push(decision));
  }

  readonly #onDecision = (decision: StampedDecision): void => {
    if (this.#mask === undefined) this.#host.events.push(decision);
    else this.#mask.take(decision);
    this.#host.alarms.hear(decision);
  };

  /** A record that cannot be kept ends stimulation, and water too where the rig file says so. */
  #trouble(kind: TroubleKind | 'low', error: Error): void {
    const grave = kind === 'full' || kind === 'io' || kind === 'lost';
    this.#log[kind === 'recovered' ? 'info' : 'error']({ kind }, `record: ${error.message}`);
    if (!grave || this.#session === undefined) return;
    // Not from within the recorder, which is in the middle of its work.
    queueMicrotask(() => {
      if (this.#session === undefined) return;
      const by = { who: `the disk (${error.message})`, from: 'Lapwing' };
      this.act({ act: 'hold', what: 'stimulus', on: true }, by);
      if (this.#rig.whenFull === 'water stops') {
        this.act({ act: 'hold', what: 'water', on: true }, by);
      }
    });
  }
}

function setupFor(rig: Rig, { rules, seed, waterTodayNl, arm }: RunningSession): SessionSetup {
  const { program, file } = rules;
  const sealed = arm === undefined ? {} : { arm };
  return { rig, program, title: file.title, seed, waterTodayNl, ...sealed };
}
