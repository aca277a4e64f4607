import { type ChildProcess, type ForkOptions, fork } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { LapwingError } from '../errors/codes.js';
import type { LoopOptions, LoopReport } from '../loop/options.js';
import { rigAddress } from '../loop/rigLock.js';
import type { Rig } from '../session/rig/rig.js';
import { type Listening, listeningArguments } from '../web/listening.js';
import { simulatedRigArguments } from './simulatedRigFor.js';

export interface LaunchPlan {
  readonly rig: Rig;
  readonly loop: LoopOptions;
  readonly web?: Listening;
  /** Arguments for the simulated rig, when the rig file's port is `simulated` or `emulated`. */
  readonly simulatedRig?: readonly string[];
}

export interface LaunchEvents {
  /** The loop runs; said again after each restart. */
  ready(): void;
  webReady?(url: string): void;
  restarted(what: 'loop' | 'web', why: string): void;
  sessionEnded(folder: string, reason: string): void;
  notice?(text: string): void;
}

/** A crash this soon after so many others is not helped by another start. */
const MOST_RESTARTS = 8;
const RESTART_WINDOW_MS = 60_000;
const RESTART_DELAY_MS = 50;
const CANNOT_RUN = 2;
const WEB_AGAIN_MS = 5_000;

/**
 * Starts the loop and the web process (and the simulated rig, where the rig file asks for it), and
 * starts them again when they die: nothing else, so that there is little in it to fail.
 */
export class Launcher {
  readonly #plan: LaunchPlan;
  readonly #events: LaunchEvents;
  readonly #restarts: number[] = [];
  #rig: ChildProcess | undefined;
  #loop: ChildProcess | undefined;
  #web: ChildProcess | undefined;
  #port: string | undefined;
  #webPort: number | undefined;
  #stopping = false;
  #begun = false;
  #failure: LapwingError | Error | undefined;
  #finish!: () => void;
  /** Resolves when the loop has left for good; rejects when it cannot run. */
  readonly finished: Promise<void>;

  constructor(plan: LaunchPlan, events: LaunchEvents) {
    this.#plan = plan;
    this.#events = events;
    this.finished = new Promise((resolve, reject) => {
      this.#finish = () => (this.#failure ? reject(this.#failure) : resolve());
    });
    // Whoever awaits it later still gets the rejection; nobody is told of it twice.
    this.finished.catch(() => {});
  }

  async start(): Promise<void> {
    this.#port = this.#plan.loop.port;
    const { port } = this.#plan.rig;
    if ((port === 'simulated' || port === 'emulated') && this.#port === undefined) {
      this.#port = await this.#startSimulatedRig(port === 'emulated' ? ['--emulated'] : []);
    }
    this.#startLoop(this.#plan.loop);
  }

  /** The process numbers, for whoever tests what happens when one is killed. */
  get processes(): { loop?: number; web?: number; rig?: number } {
    return {
      ...(this.#loop?.pid === undefined ? {} : { loop: this.#loop.pid }),
      ...(this.#web?.pid === undefined ? {} : { web: this.#web.pid }),
      ...(this.#rig?.pid === undefined ? {} : { rig: this.#rig.pid }),
    };
  }

  /** Ends every child now; the board falls silent and sets its outputs idle. */
  stop(): void {
    this.#stopping = true;
    this.#web?.kill('SIGTERM');
    this.#loop?.kill('SIGTERM');
    if (!this.#loop) this.#leave();
  }

  /** Ends every child without asking; the board's own watchdog sets its outputs idle. */
  kill(): void {
    this.stop();
    this.#loop?.kill('SIGKILL');
  }

  async #startSimulatedRig(board: readonly string[]): Promise<string> {
    const tcp = process.platform === 'win32' ? ['--tcp', '0'] : [];
    const child = this.#fork('../../hardware-sim/simulatedRigProcess.js', [
      ...tcp,
      ...board,
      ...simulatedRigArguments(this.#plan.rig),
      ...['--hands', rigAddress(this.#plan.rig.name).handsPath],
      ...(this.#plan.simulatedRig ?? []),
    ]);
    this.#rig = child;
    child.once('exit', () => {
      this.#rig = undefined;
    });
    const line = await firstLine(child);
    return (JSON.parse(line) as { port: string }).port;
  }

  #startLoop(options: LoopOptions): void {
    const told = { ...options, ...(this.#port === undefined ? {} : { port: this.#port }) };
    const child = this.#fork('../loop/loopProcess.js', [JSON.stringify(told)]);
    this.#loop = child;
    child.on('message', (report: LoopReport) => this.#hear(report));
    child.once('exit', (code, signal) => this.#loopLeft(code, signal));
  }

  #hear(report: LoopReport): void {
    if (report.report === 'ready') {
      if (this.#plan.web && !this.#web) this.#startWeb();
      this.#events.ready();
    } else if (report.report === 'session began') {
      this.#begun = true;
    } else if (report.report === 'session ended') {
      this.#events.sessionEnded(report.folder, report.reason);
    } else if (report.report === 'notice') {
      this.#events.notice?.(report.text);
    } else {
      this.#failure = Object.assign(new Error(report.message), {
        code: report.code,
        remedy: report.remedy,
      });
    }
  }

  #loopLeft(code: number | null, signal: NodeJS.Signals | null): void {
    this.#loop = undefined;
    if (this.#stopping || code === 0 || code === CANNOT_RUN) {
      if (code === CANNOT_RUN) this.#failure ??= new Error('the loop cannot run');
      this.#leave();
      return;
    }
    const why = signal ? `killed by ${signal}` : `left with status ${code}`;
    const now = performance.now();
    while (this.#restarts.length > 0 && now - this.#restarts[0]! > RESTART_WINDOW_MS) {
      this.#restarts.shift();
    }
    if (this.#restarts.length >= MOST_RESTARTS) {
      this.#failure = new LapwingError('loopKeepsFailing', `The loop ${why}.`);
      this.#leave();
      return;
    }
    this.#restarts.push(now);
    this.#events.restarted('loop', why);
    // What was begun goes on by itself: the loop finds the session that it left.
    const { begin, ...rest } = this.#plan.loop;
    const again = { ...rest, resume: true, ...(this.#begun || !begin ? {} : { begin }) };
    setTimeout(() => !this.#stopping && this.#startLoop(again), RESTART_DELAY_MS);
  }

  #startWeb(): void {
    const plan = this.#plan.web!;
    const listening = { ...plan, port: this.#webPort ?? plan.port };
    const { socketPath, tokenFile } = rigAddress(this.#plan.rig.name);
    const log = process.env.LAPWING_LOG ?? 'warn';
    const { rigPath, rulesFolder, animalsFolder } = this.#plan.loop;
    const child = this.#fork('../web/webProcess.js', [
      ...['--socket', socketPath, '--token-file', tokenFile, '--rig-file', rigPath],
      ...['--records', this.#plan.loop.recordFolder ?? this.#plan.rig.recordFolder],
      ...(rulesFolder === undefined ? [] : ['--rules-folder', rulesFolder]),
      ...(animalsFolder === undefined ? [] : ['--animals-folder', animalsFolder]),
      ...[...listeningArguments(listening), '--log', log],
    ]);
    this.#web = child;
    firstLine(child).then(
      (line) => {
        const { listening } = JSON.parse(line) as { listening: string };
        // Open pages look for it where it was.
        this.#webPort = Number(new URL(listening).port);
        this.#events.webReady?.(listening);
      },
      () => {},
    );
    child.once('exit', (code, signal) => {
      this.#web = undefined;
      if (this.#stopping) return;
      if (code === CANNOT_RUN) {
        this.#webCannotRun();
        return;
      }
      this.#events.restarted('web', signal ? `killed by ${signal}` : `left with status ${code}`);
      setTimeout(() => !this.#stopping && !this.#web && this.#startWeb(), 500);
    });
  }

  /**
   * The page is a guest of a session that runs; without a session, it is all there is. One that could
   * be served before (a certificate was replaced by half, say) is tried again: a session may run.
   */
  #webCannotRun(): void {
    if (this.#webPort !== undefined) {
      this.#events.restarted('web', 'cannot be served for now');
      setTimeout(() => !this.#stopping && !this.#web && this.#startWeb(), WEB_AGAIN_MS);
      return;
    }
    if (this.#plan.loop.exitWhenEnded) return;
    this.#failure = new Error('the page cannot be served');
    this.stop();
  }

  #fork(script: string, args: readonly string[]): ChildProcess {
    const options: ForkOptions = {
      // A terminal's Ctrl-C must not reach them: the launcher ends the session first.
      detached: process.platform !== 'win32',
      stdio: ['pipe', 'pipe', 'inherit', 'ipc'],
    };
    return fork(fileURLToPath(new URL(script, import.meta.url)), args, options);
  }

  #leave(): void {
    this.#stopping = true;
    this.#web?.kill('SIGTERM');
    this.#rig?.kill('SIGTERM');
    this.#finish();
  }
}

/** The first line that a child prints; rejects when it leaves without one. */
function firstLine(child: ChildProcess): Promise<string> {
  return new Promise((resolve, reject) => {
    let text = '';
    child.stdout?.on('data', (bytes: Buffer) => {
      text += bytes.toString('utf8');
      const end = text.indexOf('\n');
      if (end >= 0) resolve(text.slice(0, end));
    });
    child.once('exit', (code) => reject(new Error(`left with status ${code} before it was ready`)));
  });
}
