import { type ChildProcess, fork } from 'node:child_process';
import { join } from 'node:path';
import { ERRORS, LapwingError } from '../../errors/codes.js';
import { packageRoot } from '../../packageRoot.js';
import type { RehearsalState } from '../rules/rulesMessages.js';
import type { RehearsalReport, RehearsalTask } from './rehearsalMessages.js';

const PROCESS = join(packageRoot, 'dist/server/main/rehearsalProcess.js');
const MOST_REAL_MS = 120_000;
/** A thousand sessions of an hour on two busy cores. */
const MOST_REAL_MANY_MS = 900_000;
/** A rehearsal needs some tens of megabytes; a file that makes it need more is stopped. */
const MOST_MEMORY_MB = 512;

/** At most one rehearsal at a time, in a process of its own; the newest result is kept. */
export class Rehearsals {
  #state: RehearsalState = { state: 'none' };
  #child: ChildProcess | undefined;
  #number = 0;

  constructor(
    private readonly script = PROCESS,
    private readonly mostRealMs = MOST_REAL_MS,
  ) {}

  get state(): RehearsalState {
    return this.#state;
  }

  /**
   * Begins one; its number tells its state from another's.
   * @throws LapwingError WEB_REHEARSAL_BUSY
   */
  begin(task: RehearsalTask): number {
    if (this.#state.state === 'running') {
      const { sessionS, runs, runsDone } = this.#state;
      const done =
        runs > 1
          ? `${runsDone} of its ${runs} sessions are done`
          : `${Math.round(sessionS / 60)} minutes of its session are done`;
      throw new LapwingError('webRehearsalBusy', `${done}.`);
    }
    const number = ++this.#number;
    const { runs } = task;
    const mostS = task.minutes * 60;
    const running = { state: 'running', number, sessionS: 0, mostS, runs, runsDone: 0 } as const;
    const mostRealMs = runs > 1 ? Math.max(this.mostRealMs, MOST_REAL_MANY_MS) : this.mostRealMs;
    this.#state = running;
    const child = fork(this.script, [], {
      // Nothing of this process's own: no debugger port, no loader.
      execArgv: [`--max-old-space-size=${MOST_MEMORY_MB}`],
      stdio: ['ignore', 'ignore', 'ignore', 'ipc'],
    });
    this.#child = child;
    const late = setTimeout(() => {
      this.#fail(number, `It had not ended after ${mostRealMs / 1000} s of real time.`);
      child.kill('SIGKILL');
    }, mostRealMs);
    child.on('message', (report: RehearsalReport) => {
      if (this.#runs(number)) this.#state = stateAfter(report, running);
    });
    child.once('error', (error) => this.#fail(number, error.message));
    child.once('exit', (code, signal) => {
      clearTimeout(late);
      if (this.#child === child) this.#child = undefined;
      this.#fail(number, `Its process left early: ${signal ?? `status ${code}`}.`);
    });
    child.send(task, () => {});
    return number;
  }

  /** Ends the one that runs; true when there was one. */
  cancel(): boolean {
    if (this.#state.state !== 'running') return false;
    this.#state = { state: 'cancelled', number: this.#state.number };
    this.#child?.kill('SIGKILL');
    return true;
  }

  #runs(number: number): boolean {
    return this.#state.state === 'running' && this.#state.number === number;
  }

  #fail(number: number, detail: string): void {
    if (!this.#runs(number)) return;
    const { code, remedy } = ERRORS.webInternal;
    this.#state = { state: 'failed', number, code, detail, remedy };
  }
}

function stateAfter(
  report: RehearsalReport,
  running: Extract<RehearsalState, { state: 'running' }>,
): RehearsalState {
  const { number } = running;
  switch (report.report) {
    case 'progress':
      return { ...running, sessionS: report.sessionS };
    case 'runs':
      return { ...running, runsDone: report.done };
    case 'done':
      return { state: 'done', number, result: report.result };
    case 'many done':
      return { state: 'many done', number, result: report.result };
    case 'failed':
      return { state: 'failed', number, ...failure(report) };
  }
}

function failure({ code, detail, remedy }: Extract<RehearsalReport, { report: 'failed' }>) {
  return { code, detail, remedy };
}
