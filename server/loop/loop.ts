import { setTimeout as delay } from 'node:timers/promises';
import type { Logger } from 'pino';
import { asKnown } from '../errors/asKnown.js';
import { LapwingError } from '../errors/codes.js';
import type { LinkHandler, LinkUp } from '../link/linkHandler.js';
import { packageVersion } from '../packageRoot.js';
import type { Actor, RareInput } from '../session/inputs.js';
import { type PreparedRules, prepareRules } from '../session/prepare.js';
import { readRig } from '../session/rig/readRig.js';
import type { Rig } from '../session/rig/rig.js';
import type { Sample } from '../wire/messages.js';
import { beginOptionsOf } from './beginChecks.js';
import { Bench } from './bench.js';
import { Board, linkUpInput } from './board.js';
import { BookTalk } from './bookTalk.js';
import { leftOver } from './currentSession.js';
import { EventRing } from './eventRing.js';
import { hideArm } from './hideArm.js';
import { LocalServer, type LoopService } from './localServer.js';
import { Minder, TICK_MS } from './minder.js';
import type { BeginOptions, LoopOptions, LoopReport } from './options.js';
import type { AskedBy, ClientMessage, Setup, Snapshot, Tried } from './protocol.js';
import { type RigAddress, rigAddress } from './rigLock.js';
import { Sessions } from './sessions.js';
import { setupOf, snapshotOf } from './view.js';

const EVENTS_KEPT = 20_000;
/** What was cut short at the end is reported within a few frames. */
const LAST_WORDS_MS = 600;

/**
 * One rig's loop: owns the port and the record, and runs one session after another. Between
 * sessions the same code follows the belt with rules that do nothing, so that the page shows the
 * animal before anything is begun.
 *
 * Here the parts meet: what the board says (`Board`) and what local clients ask (`LocalServer`) goes
 * to what runs (`Sessions`); `Minder` sees to the rest by the clock.
 */
export class Loop implements LinkHandler, LoopService {
  readonly version = packageVersion;
  readonly rig: string;
  readonly events = new EventRing(EVENTS_KEPT);
  readonly bench = new Bench({
    rig: () => this.#sessions.rig,
    board: () => this.#board.link.identity,
    send: (name, message) => this.#board.send(name, message),
    begin: (runner) => this.#sessions.runBench(runner),
    ended: () => {
      this.#board.quietAll();
      if (this.#sessions.session === undefined) this.#sessions.goIdle();
    },
  });
  readonly #options: LoopOptions;
  readonly #log: Logger;
  readonly #report: (report: LoopReport) => void;
  readonly #leave: () => void;
  readonly #address: RigAddress;
  readonly #server: LocalServer;
  readonly #board: Board;
  readonly #sessions: Sessions;
  readonly #minder: Minder;
  readonly #rulesFolder: string;
  #toBegin: (BeginOptions & { readonly rules: PreparedRules }) | undefined;
  #tick: NodeJS.Timeout | undefined;

  constructor(
    rig: Rig,
    options: LoopOptions,
    log: Logger,
    report: (report: LoopReport) => void,
    leave: () => void,
  ) {
    this.rig = rig.name;
    this.#options = options;
    this.#log = log;
    this.#report = report;
    this.#leave = leave;
    this.#rulesFolder = options.rulesFolder ?? rig.rulesFolder;
    this.#address = rigAddress(rig.name);
    this.#server = new LocalServer(this, this.#address);
    this.#board = new Board(rig, options.port, this);
    this.#minder = new Minder(rig, this.#board.link, log);
    this.#sessions = this.#sessionsOf(rig);
  }

  #sessionsOf(rig: Rig): Sessions {
    const recordFolder = this.#options.recordFolder ?? rig.recordFolder;
    const animalsFolder = this.#options.animalsFolder ?? rig.animalsFolder;
    const { alarms, stalls } = this.#minder;
    return new Sessions(rig, {
      board: this.#board,
      bench: this.bench,
      book: new BookTalk(rig.name, animalsFolder, recordFolder, this.#log, (text) =>
        this.#report({ report: 'notice', text }),
      ),
      ...{ events: this.events, alarms, stalls, log: this.#log, recordFolder },
      currentFile: this.#address.currentFile,
      began: (folder) => {
        this.#report({ report: 'session began', folder });
        this.#server.announceSetup();
      },
      ended: (folder, reason) => {
        this.#server.announceSetup();
        this.#report({ report: 'session ended', folder, reason });
      },
      closed: () => {
        if (this.#options.exitWhenEnded) this.#leave();
      },
    });
  }

  /** @throws LapwingError LOOP_RIG_TAKEN, or what is wrong with the rules file to begin with */
  async start(): Promise<void> {
    await this.#server.open();
    const left = leftOver(this.#address.currentFile);
    if (left === undefined) this.#prepare(this.#options.begin);
    else if (this.#options.resume) await this.#sessions.resume(left);
    else throw new LapwingError('loopUnfinished', `${left.folder} was left unfinished.`);
    this.#board.link.start();
    const snapshot = (): Snapshot => this.snapshot();
    this.#tick = setInterval(() => this.#minder.tick(this.#sessions, snapshot), TICK_MS);
    this.#report({ report: 'ready' });
  }

  /** Compiles what is to begin before there is a board to keep waiting. */
  #prepare(begin: BeginOptions | undefined): void {
    if (begin === undefined) return;
    this.#toBegin = { ...begin, rules: prepareRules(begin.rulesPath, this.#sessions.rig) };
  }

  /** Ends the session, waits briefly for the board's last words, and closes the record. */
  async close(reason: string): Promise<void> {
    const sessions = this.#sessions;
    if (sessions.session !== undefined) {
      sessions.take({ kind: 'operator', act: { act: 'end', reason }, by: SELF });
      const untilMs = performance.now() + LAST_WORDS_MS;
      while (sessions.session !== undefined && performance.now() < untilMs) await delay(5);
      if (sessions.session !== undefined) this.down(new LapwingError('linkSilent', reason));
    }
    this.#board.quietAll();
    clearInterval(this.#tick);
    await this.#board.link.close();
    this.#server.close();
    // The record is finished, and the water book told, before the program is gone.
    await sessions.closing;
  }

  #fail(error: unknown): void {
    const { code, message, remedy } = asKnown(error);
    this.#report({ report: 'failed', code, message, remedy });
    process.exitCode = 2;
    this.#leave();
  }

  // ---- the board -----------------------------------------------------------------------------

  sample(message: Sample): void {
    this.#sessions.sample(message);
    this.bench.sample(message, this.#sessions.runner.core.tracker.stampUs);
  }
  edge(message: Extract<RareInput, { kind: 'edge' }>['message']): void {
    this.#sessions.take({ kind: 'edge', message });
    // An input may be wired back from an output, which tells the arm of a blinded session.
    if (this.#sessions.mask !== undefined) return;
    this.bench.edge(message, this.#sessions.runner.core.tracker.stampUs);
  }
  outcome(message: Extract<RareInput, { kind: 'outcome' }>['message']): void {
    this.#board.saw(message.id);
    this.#sessions.take({ kind: 'outcome', message });
    if (this.#sessions.mask !== undefined) return;
    this.bench.outcome(message, this.#sessions.runner.core.tracker.extend(message.boardUs));
  }
  fault(message: Extract<RareInput, { kind: 'fault' }>['message']): void {
    this.#log.warn({ fault: message }, 'the board reported a fault');
    this.#sessions.take({ kind: 'fault', message });
  }
  clock(message: Extract<RareInput, { kind: 'clock' }>['message']): void {
    this.#sessions.take({ kind: 'clock', message });
  }
  gap(frames: number): void {
    this.#sessions.take({ kind: 'gap', frames });
  }
  badFrame(why: string): void {
    this.#sessions.take({ kind: 'bad frame', why });
  }

  up(event: LinkUp): void {
    this.#log.info({ port: event.port, model: event.identity.model }, 'the board answers');
    this.#board.answered(event);
    this.#sessions.take(linkUpInput(event));
    const begin = this.#toBegin;
    if (begin === undefined) return;
    this.#toBegin = undefined;
    this.#sessions.begin(begin, begin.rules).catch((error: unknown) => this.#fail(error));
  }

  down(why: LapwingError): void {
    this.#log.warn({ code: why.code }, why.message);
    this.#sessions.take({ kind: 'link down', reason: why.message });
    this.batchEnd();
  }

  waiting(why: LapwingError, retryMs: number): void {
    this.#log.debug({ code: why.code, retryMs }, why.message);
    // Whoever asked for a session now wants to hear now; later, a board is waited for.
    if (this.#toBegin !== undefined && !this.#board.hasAnswered) this.#fail(why);
  }

  batchEnd(): void {
    this.#sessions.batchEnd();
  }

  // ---- local clients -------------------------------------------------------------------------

  setup(): Setup {
    const { rig, session } = this.#sessions;
    return setupOf(rig, this.#rulesFolder, this.#board.link, session);
  }

  snapshot(): Snapshot {
    const { runner, session, record, endedBecause, mask, rig } = this.#sessions;
    const state = snapshotOf(
      runner.core,
      this.#board.link,
      session,
      record.view(),
      this.#minder.framesPerS,
      endedBecause,
      this.#minder.alarms.on,
    );
    return mask === undefined ? state : hideArm(state, mask, rig);
  }

  quiet(by: AskedBy): void {
    this.bench.close('everything was stopped');
    this.#sessions.act({ act: 'stop everything' }, localActor(by));
    // Sent once more whatever the session thinks: it can only make things idle.
    this.#board.quietAll();
  }

  end(reason: string, by: AskedBy): void {
    if (this.#sessions.session === undefined) {
      throw new LapwingError('loopNoSession', 'Nothing to end.');
    }
    this.#sessions.act({ act: 'end', reason }, localActor(by));
  }

  begin(message: Extract<ClientMessage, { say: 'begin' }>): Promise<void> {
    return this.#sessions.begin(beginOptionsOf(message, this.#rulesFolder));
  }

  act(message: Extract<ClientMessage, { say: 'act' }>): void {
    this.#sessions.act(message.act, { who: String(message.who), from: String(message.from) });
  }

  // ---- between sessions ----------------------------------------------------------------------

  tryOutput(message: Extract<ClientMessage, { say: 'try' }>): Promise<Tried> {
    if (this.#sessions.busy) {
      throw new LapwingError('benchInSession', `\`${message.output}\` was not tried.`);
    }
    if (this.#board.link.state !== 'up') {
      throw new LapwingError('loopNoBoard', 'Nothing was tried.');
    }
    return this.bench.attempt(message);
  }

  /** Reads the rig file again: calibrations that it names may be others now. */
  reload(): void {
    if (this.#sessions.busy) {
      throw new LapwingError('loopBusy', 'The rig file is read again between sessions.');
    }
    const rig = readRig(this.#options.rigPath);
    const { name, port, baudRate, boardId } = this.#sessions.rig;
    const same = rig.name === name && rig.port === port && rig.baudRate === baudRate;
    if (!same || rig.boardId !== boardId) {
      throw new LapwingError('benchOtherRig', `${rig.path}: name, port, baud or board_id changed.`);
    }
    this.bench.close('the rig file is read again');
    this.#sessions.useRig(rig);
    this.#server.announceSetup();
  }
}

function localActor({ who, from }: AskedBy): Actor {
  return { who: who || 'a local client', from: from || 'local socket' };
}

const SELF: Actor = { who: 'Lapwing', from: 'this computer' };
