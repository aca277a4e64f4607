import { type ChildProcess, fork } from 'node:child_process';
import { randomBytes } from 'node:crypto';
import { LapwingError } from '../../errors/codes.js';
import { rfc3339 } from '../../session/description.js';
import type { JobReport, JobState, JobTold } from './jobMessages.js';

/** Work for a process of its own: a script that calls `serveJob`, and the task it is sent. */
export interface JobPlan {
  readonly kind: string;
  readonly about: readonly string[];
  readonly script: string;
  readonly task: object;
  /** Called with the process's number when it left without a result: it may have half made something. */
  readonly tidy?: (pid: number) => void;
}

export interface JobLimits {
  /** Processes at once: a live session on the same machine comes first. */
  readonly atOnce: number;
  readonly mostWaiting: number;
  /** Ended jobs whose results are kept. */
  readonly mostKept: number;
  /** A process that takes longer, or more memory, is stopped. */
  readonly mostMs: number;
  readonly mostMemoryMb: number;
}

export const JOB_LIMITS: JobLimits = {
  atOnce: 1,
  mostWaiting: 32,
  mostKept: 64,
  mostMs: 30 * 60_000,
  mostMemoryMb: 2048,
};

interface Job {
  readonly id: string;
  readonly plan: JobPlan;
  /** Stands for the plan: the same work asked for twice is done once. */
  readonly key: string;
  readonly askedAt: string;
  state: JobState;
  child?: ChildProcess;
}

/** Long work, one after another, each in a process of its own that can be followed and cancelled. */
export class Jobs {
  readonly #limits: JobLimits;
  /** In the order in which they were asked for. */
  readonly #jobs = new Map<string, Job>();
  #closed = false;

  constructor(limits: Partial<JobLimits> = {}) {
    this.#limits = { ...JOB_LIMITS, ...limits };
  }

  /**
   * Puts work into the queue; where the very same is waiting or running, that is it.
   * @returns its id
   * @throws LapwingError WEB_TOO_MANY_JOBS
   */
  begin(plan: JobPlan): string {
    const key = JSON.stringify([plan.kind, plan.script, plan.task]);
    const same = this.#unended().find((job) => job.key === key);
    if (same) return same.id;
    const waiting = this.#unended().filter(({ state }) => state.state === 'waiting').length;
    if (waiting >= this.#limits.mostWaiting) {
      throw new LapwingError('webTooManyJobs', `${waiting} jobs are waiting.`);
    }
    const id = randomBytes(8).toString('hex');
    const state: JobState = { state: 'waiting', ahead: 0 };
    this.#jobs.set(id, { id, plan, key, askedAt: rfc3339(new Date()), state });
    this.#forgetOld();
    this.#startNext();
    return id;
  }

  /** @throws LapwingError WEB_JOB_UNKNOWN */
  told(id: string): JobTold {
    const { plan, askedAt, state } = this.#find(id);
    return { id, kind: plan.kind, about: plan.about, askedAt, ...this.#withPlace(id, state) };
  }

  /** Every job that is known, the newest first, without results. */
  list(): JobTold[] {
    return [...this.#jobs.keys()].reverse().map((id) => {
      const told = this.told(id);
      return told.state === 'done' ? { ...told, result: null } : told;
    });
  }

  /**
   * Ends it, waiting or running; one that has ended stays as it is.
   * @throws LapwingError WEB_JOB_UNKNOWN
   */
  cancel(id: string): void {
    const job = this.#find(id);
    if (!unended(job)) return;
    job.state = { state: 'cancelled' };
    job.child?.kill('SIGKILL');
    this.#startNext();
  }

  /** Ends all of them; no other begins. */
  close(): void {
    this.#closed = true;
    for (const { id } of this.#unended()) this.cancel(id);
  }

  #find(id: string): Job {
    const job = this.#jobs.get(id);
    if (!job) throw new LapwingError('webJobUnknown', `There is no job ${JSON.stringify(id)}.`);
    return job;
  }

  #unended(): Job[] {
    return [...this.#jobs.values()].filter(unended);
  }

  #withPlace(id: string, state: JobState): JobState {
    if (state.state !== 'waiting') return state;
    return { state: 'waiting', ahead: this.#unended().findIndex((job) => job.id === id) };
  }

  #startNext(): void {
    // A cancelled one counts until its process is gone.
    const running = [...this.#jobs.values()].filter(({ child }) => child).length;
    if (this.#closed || running >= this.#limits.atOnce) return;
    const next = this.#unended().find(({ state }) => state.state === 'waiting');
    if (next) this.#start(next);
  }

  #start(job: Job): void {
    const { mostMs, mostMemoryMb } = this.#limits;
    const beganMs = performance.now();
    const child = fork(job.plan.script, [], {
      // Nothing of this process's own: no debugger port, no loader.
      execArgv: [`--max-old-space-size=${mostMemoryMb}`],
      stdio: ['ignore', 'ignore', 'ignore', 'ipc'],
    });
    job.child = child;
    job.state = { state: 'running', done: 0, doing: 'beginning' };
    const late = setTimeout(() => {
      fail(job, `It had not ended after ${mostMs / 1000} s.`);
      child.kill('SIGKILL');
    }, mostMs);
    child.on('message', (report: JobReport) => {
      if (unended(job)) job.state = stateAfter(report, (performance.now() - beganMs) / 1000);
    });
    let gone = false;
    const left = (why: string) => {
      if (gone) return;
      gone = true;
      clearTimeout(late);
      delete job.child;
      fail(job, why);
      if (job.state.state !== 'done' && child.pid) job.plan.tidy?.(child.pid);
      this.#startNext();
    };
    child.once('error', (error) => left(error.message));
    child.once('exit', (code, signal) => {
      left(`Its process left early: ${signal ?? `status ${code}`}.`);
    });
    child.send(job.plan.task, () => {});
  }

  #forgetOld(): void {
    const ended = [...this.#jobs.values()].filter((job) => !unended(job));
    for (const { id, child } of ended.slice(0, Math.max(0, ended.length - this.#limits.mostKept))) {
      // A cancelled one is counted until its process is gone.
      if (!child) this.#jobs.delete(id);
    }
  }
}

function unended({ state }: Job): boolean {
  return state.state === 'waiting' || state.state === 'running';
}

function fail(job: Job, detail: string): void {
  if (!unended(job)) return;
  const { code, remedy } = new LapwingError('webJobDied', detail);
  job.state = { state: 'failed', code, detail, remedy };
}

function stateAfter(report: JobReport, tookS: number): JobState {
  switch (report.report) {
    case 'progress':
      return { state: 'running', done: report.done, doing: report.doing };
    case 'done':
      return { state: 'done', tookS, result: report.result };
    case 'failed':
      return { state: 'failed', ...particulars(report) };
  }
}

function particulars({ code, detail, remedy }: Extract<JobReport, { report: 'failed' }>) {
  return { code, detail, remedy };
}
