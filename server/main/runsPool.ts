import { availableParallelism } from 'node:os';
import { join } from 'node:path';
import { Worker } from 'node:worker_threads';
import { LapwingError } from '../errors/codes.js';
import { packageRoot } from '../packageRoot.js';
import type { RunResult } from '../rehearse/runResult.js';
import type { RunsSetting } from './runOnce.js';
import type { WorkerReport } from './runsWorker.js';

const WORKER = join(packageRoot, 'dist/server/main/runsWorker.js');
/** A session needs some tens of megabytes; a file that makes it need more is stopped. */
const MOST_MEMORY_MB = 512;

export interface PoolOptions {
  /** Threads; as many as there are cores unless said. */
  readonly jobs?: number;
  /** Called with the share of runs done. */
  readonly progress?: (done: number) => void;
  /** Ends everything at once; the promise is then rejected with the signal's reason. */
  readonly signal?: AbortSignal;
}

/**
 * Rehearses so many sessions on several cores, each thread taking the next as it is free.
 * @returns their results in the order of the runs, the same however many threads there are
 * @throws LapwingError REHEARSE_FAILED
 */
export async function runAll(
  setting: RunsSetting,
  runs: number,
  { jobs = availableParallelism(), progress = () => {}, signal }: PoolOptions = {},
): Promise<RunResult[]> {
  const results: RunResult[] = [];
  const workers = Array.from(
    { length: Math.min(jobs, runs) },
    () =>
      new Worker(WORKER, {
        workerData: setting,
        resourceLimits: { maxOldGenerationSizeMb: MOST_MEMORY_MB },
      }),
  );
  let next = 0;
  const { promise, resolve, reject } = withResolvers();
  const abort = () => reject(signal!.reason);
  const give = (worker: Worker) => {
    if (next < runs) worker.postMessage(next++);
  };
  for (const worker of workers) {
    worker.on('message', (report: WorkerReport) => {
      if (report.report === 'failed') {
        reject(new LapwingError('rehearseFailed', `A run failed: ${report.message}.`));
        return;
      }
      results.push(report.result);
      progress(results.length / runs);
      if (results.length === runs) resolve();
      else give(worker);
    });
    worker.once('error', (error) =>
      reject(new LapwingError('rehearseFailed', `${error.message}.`)),
    );
    worker.once('exit', (code) => {
      if (code !== 0) reject(new LapwingError('rehearseFailed', `A thread left with ${code}.`));
    });
    give(worker);
  }
  signal?.addEventListener('abort', abort, { once: true });
  if (signal?.aborted) abort();
  try {
    await promise;
  } finally {
    signal?.removeEventListener('abort', abort);
    await Promise.all(workers.map((worker) => worker.terminate()));
  }
  return results.sort((a, b) => a.run - b.run);
}

/** `Promise.withResolvers`, which Node 20 lacks. */
function withResolvers() {
  let resolve: () => void = () => {};
  let reject: (reason: unknown) => void = () => {};
  const promise = new Promise<void>((done, failed) => {
    resolve = done;
    reject = failed;
  });
  return { promise, resolve, reject };
}
