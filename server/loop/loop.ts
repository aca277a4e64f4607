import { rmSync } from 'node:fs';
import { join, resolve, sep } from 'node:path';
import { setTimeout as delay } from 'node:timers/promises';
import type { Logger } from 'pino';
import { asKnown } from '../errors/asKnown.js';
import { LapwingError } from '../errors/codes.js';
import { BoardLink } from '../link/boardLink.js';
import type { LinkHandler, LinkUp } from '../link/linkHandler.js';
import { portOpener } from '../link/resolvePort.js';
import { packageVersion } from '../packageRoot.js';
import { armFor, armOf, needArm } from '../session/blinding/arms.js';
import { LiveMask } from '../session/blinding/liveMask.js';
import type { SessionSetup } from '../session/core/sessionCore.js';
import type { StampedDecision } from '../session/decisions.js';
import { readDescription } from '../session/description.js';
import type { Actor, OperatorAct, RareInput } from '../session/inputs.js';
import { preflightAgainst } from '../session/preflight.js';
import { idleRules, newSeed, type PreparedRules, prepareRules } from '../session/prepare.js';
import { finish } from '../session/record/finish.js';
import { readRecord } from '../session/record/readRecord.js';
import { Recorder } from '../session/record/recorder.js';
import type { TroubleKind } from '../session/record/segmentLog.js';
import { readRig } from '../session/rig/readRig.js';
import type { Rig } from '../session/rig/rig.js';
import { SessionRunner } from '../session/runner.js';
import {
  describeEnd,
  nextSessionNumber,
  openSession,
  recordHeaderOf,
  type SessionCard,
} from '../session/store.js';
import { CAPABILITY, type Sample } from '../wire/messages.js';
import { ALARMS } from './alarms/alarms.js';
import { AlarmWatch } from './alarms/alarmWatch.js';
import { StallWatch } from './alarms/stallWatch.js';
import { Bench } from './bench.js';
import { BookTalk } from './bookTalk.js';
import { checkAct } from './checkAct.js';
import { type CurrentSession, keepCurrent, leftOver } from './currentSession.js';
import { EventRing } from './eventRing.js';
import { hideArm } from './hideArm.js';
import { LiveRecord } from './liveRecord.js';
import { LocalServer, type LoopService } from './localServer.js';
import type { BeginOptions, LoopOptions, LoopReport } from './options.js';
import type { AskedBy, ClientMessage, Setup, Snapshot, Tried } from './protocol.js';
import { type RigAddress, rigAddress } from './rigLock.js';
import { type RunningSession, setupOf, snapshotOf } from './view.js';

const EVENTS_KEPT = 20_000;
const TICK_MS = 20;
const LOOK_MS = 250;
const HANDSHAKE_MS = 3_000;
/** Ids of a loop that was killed, which the board may know and has not told. */
const ID_MARGIN = 1_000;
/** What was cut short at the end is reported within a few frames. */
const LAST_WORDS_MS = 600;

/**
 * One rig's loop: owns the port and the record, and runs one session after another. Between
 * sessions the same code follows the belt with rules that do nothing, so that the page shows the
 * animal before anything is begun.
 */
export class Loop implements LinkHandler, LoopService {
  readonly version = packageVersion;
  readonly rig: string;
  readonly events = new EventRing(EVENTS_KEPT);
  readonly bench = new Bench({
    rig: () => this.#rigFile,
    board: () => this.#link.identity,
    send: (name, message) => this.#send(name, message),
    begin: (runner) => {
      this.#runner = runner;
      this.#takeLinkUp();
      this.#take({ kind: 'begin', firstId: this.#highestId + ID_MARGIN });
    },
    ended: () => {
      this.#link.send('quiet', { outputs: 0xffff });
      if (this.#session === undefined) this.#goIdle();
    },
  });
  #rigFile: Rig;
  readonly #options: LoopOptions;
  readonly #log: Logger;
  readonly #report: (report: LoopReport) => void;
  readonly #leave: () => void;
  readonly #address: RigAddress;
  readonly #server: LocalServer;
  readonly #link: BoardLink;
  readonly #record: LiveRecord;
  readonly #recordFolder: string;
  readonly #rulesFolder: string;
  readonly #book: BookTalk;
  #runner: SessionRunner;
  /** While a blinded session runs: what may be shown of it. */
  #mask: LiveMask | undefined;
  #session: RunningSession | undefined;
  #ended: string | null = null;
  #lastUp: LinkUp | undefined;
  #toBegin: (BeginOptions & { readonly rules: PreparedRules }) | undefined;
  #beginning = false;
  /** The highest id that the board has been seen to know, over all sessions. */
  #highestId = 0;
  #tick: NodeJS.Timeout | undefined;
  #framesBefore = 0;
  #framesAtMs = performance.now();
  #framesPerS = 0;
  readonly #alarms: AlarmWatch;
  readonly #stalls = new StallWatch(TICK_MS);
  #lookedMs = 0;
  #closing: Promise<void> = Promise.resolve();

  constructor(
    rig: Rig,
    options: LoopOptions,
    log: Logger,
    report: (report: LoopReport) => void,
    leave: () => void,
  ) {
    this.rig = rig.name;
    this.#rigFile = rig;
    this.#options = options;
    this.#log = log;
    this.#report = report;
    this.#leave = leave;
    this.#recordFolder = options.recordFolder ?? rig.recordFolder;
    this.#rulesFolder = options.rulesFolder ?? rig.rulesFolder;
    this.#book = new BookTalk(
      rig.name,
      options.animalsFolder ?? rig.animalsFolder,
      this.#recordFolder,
      log,
      (text) => report({ report: 'notice', text }),
    );
    this.#address = rigAddress(rig.name);
    this.#server = new LocalServer(this, this.#address);
    this.#record = new LiveRecord(this.#recordFolder, (kind, error) => this.#trouble(kind, error));
    this.#alarms = new AlarmWatch(rig);
    this.#runner = this.#idleRunner();
    const { baudRate, boardId } = rig;
    this.#link = new BoardLink({
      openPort: portOpener(options.port ?? rig.port, { baudRate }),
      handler: this,
      ...(boardId === undefined ? {} : { boardId }),
    });
  }

  /** @throws LapwingError LOOP_RIG_TAKEN, or what is wrong with the rules file to begin with */
  async start(): Promise<void> {
    await this.#server.open();
    const left = leftOver(this.#address.currentFile);
    if (left === undefined) this.#prepare(this.#options.begin);
    else if (this.#options.resume) await this.#resume(left);
    else throw new LapwingError('loopUnfinished', `${left.folder} was left unfinished.`);
    this.#link.start();
    this.#tick = setInterval(() => this.#everyTick(), TICK_MS);
    this.#report({ report: 'ready' });
  }

  /** Compiles what is to begin before there is a board to keep waiting. */
  #prepare(begin: BeginOptions | undefined): void {
    if (begin === undefined) return;
    this.#toBegin = { ...begin, rules: prepareRules(begin.rulesPath, this.#rigFile) };
  }

  /** Ends the session, waits briefly for the board's last words, and closes the record. */
  async close(reason: string): Promise<void> {
    if (this.#session !== undefined) {
      this.#take({ kind: 'operator', act: { act: 'end', reason }, by: SELF });
      const untilMs = performance.now() + LAST_WORDS_MS;
      while (this.#session !== undefined && performance.now() < untilMs) await delay(5);
      if (this.#session !== undefined) this.down(new LapwingError('linkSilent', reason));
    }
    this.#link.send('quiet', { outputs: 0xffff });
    clearInterval(this.#tick);
    await this.#link.close();
    this.#server.close();
    // The record is finished, and the water book told, before the program is gone.
    await this.#closing;
  }

  // ---- the board -----------------------------------------------------------------------------

  sample(message: Sample): void {
    this.#runner.sample(message);
    this.bench.sample(message, this.#runner.core.tracker.stampUs);
  }
  edge(message: Extract<RareInput, { kind: 'edge' }>['message']): void {
    this.#take({ kind: 'edge', message });
    // An input may be wired back from an output, which tells the arm of a blinded session.
    if (this.#mask === undefined) this.bench.edge(message, this.#runner.core.tracker.stampUs);
  }
  outcome(message: Extract<RareInput, { kind: 'outcome' }>['message']): void {
    this.#highestId = Math.max(this.#highestId, message.id);
    this.#take({ kind: 'outcome', message });
    if (this.#mask !== undefined) return;
    this.bench.outcome(message, this.#runner.core.tracker.extend(message.boardUs));
  }
  fault(message: Extract<RareInput, { kind: 'fault' }>['message']): void {
    this.#log.warn({ fault: message }, 'the board reported a fault');
    this.#take({ kind: 'fault', message });
  }
  clock(message: Extract<RareInput, { kind: 'clock' }>['message']): void {
    this.#take({ kind: 'clock', message });
  }
  gap(frames: number): void {
    this.#take({ kind: 'gap', frames });
  }
  badFrame(why: string): void {
    this.#take({ kind: 'bad frame', why });
  }

  up(event: LinkUp): void {
    this.#log.info({ port: event.port, model: event.identity.model }, 'the board answers');
    this.#lastUp = event;
    this.#take(linkUpInput(event));
    const begin = this.#toBegin;
    if (begin === undefined) return;
    this.#toBegin = undefined;
    this.#begin(begin, begin.rules).catch((error: unknown) => this.#fail(error));
  }

  down(why: LapwingError): void {
    this.#log.warn({ code: why.code }, why.message);
    this.#take({ kind: 'link down', reason: why.message });
    this.batchEnd();
  }

  waiting(why: LapwingError, retryMs: number): void {
    this.#log.debug({ code: why.code, retryMs }, why.message);
    // Whoever asked for a session now wants to hear now; later, a board is waited for.
    if (this.#toBegin !== undefined && this.#lastUp === undefined) this.#fail(why);
  }

  batchEnd(): void {
    this.#runner.batchEnd();
    if (this.#session !== undefined && this.#runner.core.state === 'ended') {
      this.#endSession(this.#runner.core.endedBy);
    }
  }

  // ---- local clients -------------------------------------------------------------------------

  setup(): Setup {
    return setupOf(this.#rigFile, this.#rulesFolder, this.#link, this.#session);
  }

  snapshot(): Snapshot {
    const state = snapshotOf(
      this.#runner.core,
      this.#link,
      this.#session,
      this.#record.view(),
      this.#framesPerS,
      this.#ended,
      this.#alarms.on,
    );
    return this.#mask === undefined ? state : hideArm(state, this.#mask, this.#rigFile);
  }

  quiet(by: AskedBy): void {
    this.bench.close('everything was stopped');
    this.#act({ act: 'stop everything' }, localActor(by));
    // Sent once more whatever the session thinks: it can only make things idle.
    this.#link.send('quiet', { outputs: 0xffff });
  }

  end(reason: string, by: AskedBy): void {
    if (this.#session === undefined) throw new LapwingError('loopNoSession', 'Nothing to end.');
    this.#act({ act: 'end', reason }, localActor(by));
  }

  begin(message: Extract<ClientMessage, { say: 'begin' }>): Promise<void> {
    const rulesPath = resolve(this.#rulesFolder, String(message.rules));
    if (!rulesPath.startsWith(this.#rulesFolder + sep)) {
      throw new LapwingError('rulesOutside', `\`${message.rules}\` leads out of the rules folder.`);
    }
    const subject = String(message.subject ?? '').trim();
    if (subject === '') throw new LapwingError('loopBadAct', 'A session needs a subject.');
    const experimenter = String(message.experimenter ?? '');
    const { protocolNumber, sessionNumber, seed } = message;
    const despite = String(message.despite ?? '').trim();
    return this.#begin({
      ...{ rulesPath, subject, experimenter },
      ...(protocolNumber ? { protocolNumber } : {}),
      ...(sessionNumber ? { sessionNumber } : {}),
      ...(seed ? { seed } : {}),
      ...(despite === '' ? {} : { despite }),
    });
  }

  act(message: Extract<ClientMessage, { say: 'act' }>): void {
    this.#act(message.act, { who: String(message.who), from: String(message.from) });
  }

  // ---- between sessions ----------------------------------------------------------------------

  tryOutput(message: Extract<ClientMessage, { say: 'try' }>): Promise<Tried> {
    if (this.#session !== undefined || this.#beginning) {
      throw new LapwingError('benchInSession', `\`${message.output}\` was not tried.`);
    }
    if (this.#link.state !== 'up') throw new LapwingError('loopNoBoard', 'Nothing was tried.');
    return this.bench.attempt(message);
  }

  /** Reads the rig file again: calibrations that it names may be others now. */
  reload(): void {
    if (this.#session !== undefined || this.#beginning) {
      throw new LapwingError('loopBusy', 'The rig file is read again between sessions.');
    }
    const rig = readRig(this.#options.rigPath);
    const { name, port, baudRate, boardId } = this.#rigFile;
    const same = rig.name === name && rig.port === port && rig.baudRate === baudRate;
    if (!same || rig.boardId !== boardId) {
      throw new LapwingError('benchOtherRig', `${rig.path}: name, port, baud or board_id changed.`);
    }
    this.bench.close('the rig file is read again');
    this.#rigFile = rig;
    this.#goIdle();
    this.#server.announceSetup();
  }

  // ---- sessions ------------------------------------------------------------------------------

  /**
   * Begins a session. What takes long (compiling, syncing files) is done in steps, and frames are
   * taken in between, so that the board never misses a beat.
   */
  async #begin(begin: BeginOptions, prepared?: PreparedRules): Promise<void> {
    if (this.#session !== undefined || this.#beginning) {
      throw new LapwingError('loopBusy', 'End it before another begins.');
    }
    this.#beginning = true;
    try {
      this.bench.close('a session begins');
      const rules = prepared ?? prepareRules(begin.rulesPath, this.#rigFile);
      await frames();
      const { rulesPath: _, ...who } = begin;
      const seed = begin.seed ?? newSeed();
      if (this.#link.identity === undefined) await this.#linkIsUp();
      const override = this.#preflightOverride(begin.despite);
      const known = await this.#book.before(who.subject, begin.despite);
      const arm = this.#armFor(rules, who);
      const startedAt = new Date();
      const card = { ...who, seed, startedAt, ...known, ...arm, ...override };
      await frames();
      const board = this.#link.identity ?? null;
      const opened = openSession(this.#recordFolder, this.#rigFile, rules, card, board, {
        onTrouble: (kind, error) => this.#trouble(kind, error),
      });
      await this.#linkIsUp();
      this.#start({ folder: opened.folder, rules, ...card }, opened.recorder);
      this.#book.began(opened.folder, who.subject, known.animal);
    } finally {
      this.#beginning = false;
    }
  }

  /** @throws LapwingError PREFLIGHT_AGAINST unless there is a reason to begin in spite of it */
  #preflightOverride(despite: string | undefined): Pick<SessionCard, 'preflightOverride'> {
    const { identity } = this.#link;
    // Without a board no session begins anyway.
    if (identity === undefined) return {};
    const { port } = this.#rigFile;
    const simulated = (identity.capabilities & CAPABILITY.simulated) !== 0 || port === 'emulated';
    const against = preflightAgainst(this.#rigFile, simulated, new Date());
    if (against === undefined) return {};
    if (despite) return { preflightOverride: { against, reason: despite } };
    throw new LapwingError('preflightAgainst', `${against}.`);
  }

  /** The arm of a blinded session; nothing where the rules have no sealed draw. */
  #armFor({ program }: PreparedRules, { subject, sessionNumber }: Omit<BeginOptions, 'rulesPath'>) {
    if (program.sealed === undefined) return {};
    const number = sessionNumber ?? nextSessionNumber(this.#recordFolder, subject);
    const found = armFor(program.sealed, this.#rigFile.blinding, subject, number);
    return { sessionNumber: number, ...found };
  }

  #maskFor({ program }: PreparedRules): LiveMask | undefined {
    return program.sealed && new LiveMask(program.sealed, (decision) => this.events.push(decision));
  }

  /** A board that lost us meanwhile is given the time of a handshake. */
  async #linkIsUp(): Promise<void> {
    const untilMs = performance.now() + HANDSHAKE_MS;
    do await frames();
    while (this.#link.state !== 'up' && performance.now() < untilMs);
  }

  #start(session: RunningSession, recorder: Recorder): void {
    const up = this.#link.state === 'up' ? this.#lastUp : undefined;
    if (up === undefined) {
      recorder.close('the board was gone before the session began');
      throw new LapwingError('loopNoBoard', 'The board does not answer.');
    }
    const { folder } = session;
    keepCurrent(this.#address.currentFile, session);
    this.#record.recorder = recorder;
    this.#session = session;
    this.#mask = this.#maskFor(session.rules);
    this.#ended = null;
    this.#stalls.restart();
    this.#runner = new SessionRunner(
      setupFor(this.#rigFile, session),
      this.#send,
      recorder,
      this.#onDecision,
    );
    this.#take(linkUpInput({ ...up, sameBoot: false }));
    this.#take({ kind: 'begin', firstId: this.#highestId + ID_MARGIN });
    this.batchEnd();
    this.#log.info({ folder }, 'session begun');
    this.#report({ report: 'session began', folder });
    this.#server.announceSetup();
  }

  /** Takes up the session that a loop which died was running, from its record. */
  async #resume(current: CurrentSession): Promise<void> {
    const { folder } = current;
    const rules = prepareRules(join(folder, 'rules.yaml'), this.#rigFile);
    const { blinding } = readDescription(folder);
    const arm = armOf(blinding);
    needArm(blinding, arm);
    const sealed = arm === undefined ? {} : { arm };
    const session = { ...current, rules, ...sealed, startedAt: new Date(current.startedAt) };
    this.#mask = this.#maskFor(rules);
    const reader = await readRecord(folder);
    const setup = setupFor(this.#rigFile, session);
    const runner = new SessionRunner(setup, this.#send, undefined, this.#onDecision);
    runner.replay(() =>
      reader.visit({
        sample: (_, sample) => runner.sample(sample),
        input: (_, input) => {
          // So that the link can tell whether the board has been on all the while.
          if (input.kind === 'link up') this.#link.remember(input.identity);
          runner.take(input);
        },
      }),
    );
    const recorder = Recorder.create(folder, recordHeaderOf(folder), {
      onTrouble: (kind, error) => this.#trouble(kind, error),
      resume: reader.resumePoint(),
    });
    runner.recordTo(recorder);
    this.#runner = runner;
    this.#session = session;
    this.#record.recorder = recorder;
    this.#take({ kind: 'link down', reason: 'the loop was restarted' });
    this.#take({ kind: 'resume', note: 'what was recorded has been replayed' });
    this.#log.warn({ folder, inputs: runner.core.input }, 'session resumed');
    if (runner.core.state === 'ended') this.#endSession(runner.core.endedBy);
  }

  #endSession(how: 'rules' | 'operator' | 'signal'): void {
    const session = this.#session!;
    const { core } = this.#runner;
    const { folder } = session;
    this.#session = undefined;
    this.#mask?.flush();
    this.#mask = undefined;
    this.#ended = core.endReason;
    const whole = this.#record.recorder?.close(core.endReason) ?? false;
    this.#record.recorder = undefined;
    try {
      describeEnd(folder, core, how);
    } catch (error) {
      this.#log.error({ error, folder }, 'the description could not be brought up to date');
    }
    rmSync(this.#address.currentFile, { force: true });
    this.#goIdle();
    this.#log.info({ folder, reason: core.endReason }, 'session ended');
    this.#server.announceSetup();
    this.#report({ report: 'session ended', folder, reason: core.endReason });
    if (whole) {
      // The record is whole without it, so a failure is told and nothing more.
      this.#closing = finish(folder).then(
        () => {},
        (error: Error) => this.#log.error({ folder }, error.message),
      );
    }
    this.#closing = this.#closing.then(() => this.#book.ended(folder));
    if (this.#options.exitWhenEnded) void this.#closing.then(() => this.#leave());
  }

  #goIdle(): void {
    this.#runner = this.#idleRunner();
    this.#takeLinkUp();
  }

  /** A new runner is told of the board that answers. */
  #takeLinkUp(): void {
    if (this.#lastUp === undefined || this.#link.state !== 'up') return;
    this.#take(linkUpInput({ ...this.#lastUp, sameBoot: false }));
  }

  #idleRunner(): SessionRunner {
    const rules = idleRules(this.#rigFile);
    return new SessionRunner(
      { rig: this.#rigFile, program: rules, title: '', seed: '', waterTodayNl: 0 },
      this.#send,
      undefined,
      (decision) => this.#alarms.hear(decision),
    );
  }

  // ---- within --------------------------------------------------------------------------------

  readonly #send: ConstructorParameters<typeof SessionRunner>[1] = (name, message) => {
    this.#link.send(name, message);
    if ('id' in message) this.#highestId = Math.max(this.#highestId, message.id);
  };

  readonly #onDecision = (decision: StampedDecision): void => {
    if (this.#mask === undefined) this.events.push(decision);
    else this.#mask.take(decision);
    this.#alarms.hear(decision);
  };

  #take(input: RareInput): void {
    this.#runner.take(input);
  }

  #act(act: OperatorAct, by: Actor): void {
    checkAct(act, this.#runner.core, this.#session?.rules);
    this.#take({ kind: 'operator', act, by });
    this.batchEnd();
  }

  /** A record that cannot be kept ends stimulation, and water too where the rig file says so. */
  #trouble(kind: TroubleKind | 'low', error: Error): void {
    const grave = kind === 'full' || kind === 'io' || kind === 'lost';
    this.#log[kind === 'recovered' ? 'info' : 'error']({ kind }, `record: ${error.message}`);
    if (!grave || this.#session === undefined) return;
    // Not from within the recorder, which is in the middle of its work.
    queueMicrotask(() => {
      if (this.#session === undefined) return;
      this.#act(
        { act: 'hold', what: 'stimulus', on: true },
        { who: `the disk (${error.message})`, from: 'Lapwing' },
      );
      if (this.#rigFile.whenFull === 'water stops') {
        this.#act(
          { act: 'hold', what: 'water', on: true },
          { who: `the disk (${error.message})`, from: 'Lapwing' },
        );
      }
    });
  }

  #everyTick(): void {
    const nowMs = performance.now();
    this.#record.tick(nowMs);
    this.#mask?.tick(this.#runner.core.instant.nowUs);
    this.#minds(nowMs);
    const seconds = (nowMs - this.#framesAtMs) / 1000;
    if (seconds < 1) return;
    const { frames } = this.#link.counters;
    this.#framesPerS = (frames - this.#framesBefore) / seconds;
    this.#framesBefore = frames;
    this.#framesAtMs = nowMs;
  }

  /** How long this computer held the loop up; and, now and then, every alarm. */
  #minds(nowMs: number): void {
    this.#stalls.tick(nowMs);
    if (nowMs - this.#lookedMs < LOOK_MS) return;
    this.#lookedMs = nowMs;
    const behindMs = this.#record.recorder?.behindMs ?? 0;
    const measured = { stallMs: this.#stalls.worstMs, behindMs };
    const changes = this.#alarms.look(this.snapshot(), measured, nowMs);
    for (const { alarm, raised, text } of changes) {
      const { level, remedy } = ALARMS[alarm];
      this.#log.warn({ alarm }, `${raised ? 'alarm' : 'alarm over'}: ${text}`);
      if (this.#session !== undefined)
        this.#take({ kind: 'alarm', alarm, raised, level, text, remedy });
    }
    if (changes.length > 0) this.batchEnd();
  }

  #fail(error: unknown): void {
    const { code, message, remedy } = asKnown(error);
    this.#report({ report: 'failed', code, message, remedy });
    process.exitCode = 2;
    this.#leave();
  }
}

function localActor({ who, from }: AskedBy): Actor {
  return { who: who || 'a local client', from: from || 'local socket' };
}

const SELF: Actor = { who: 'Lapwing', from: 'this computer' };

function linkUpInput({ identity, tag, sameBoot, transport }: LinkUp): RareInput {
  const simulated = (identity.capabilities & CAPABILITY.simulated) !== 0;
  return {
    kind: 'link up',
    identity,
    tag,
    sameBoot,
    overNetwork: transport === 'tcp' && !simulated,
  };
}

function setupFor(rig: Rig, { rules, seed, waterTodayNl, arm }: RunningSession): SessionSetup {
  const { program, file } = rules;
  const sealed = arm === undefined ? {} : { arm };
  return { rig, program, title: file.title, seed, waterTodayNl, ...sealed };
}

/** Lets everything that has come from the board in the meantime be taken. */
function frames(): Promise<void> {
  return new Promise((resolve) => setTimeout(resolve, 1));
}
