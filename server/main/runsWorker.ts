/** A thread that rehearses sessions, one after the other, as the pool asks for them. */
import { parentPort, workerData } from 'node:worker_threads';
import type { RunResult } from '../rehearse/runResult.js';
import { Runs, type RunsSetting } from './runOnce.js';

export type WorkerReport =
  | { readonly report: 'ran'; readonly result: RunResult }
  | { readonly report: 'failed'; readonly message: string };

const port = parentPort!;
const runs = new Runs(workerData as RunsSetting);
port.on('message', (n: number) => {
  let report: WorkerReport;
  try {
    report = { report: 'ran', result: runs.run(n) };
  } catch (error) {
    report = { report: 'failed', message: (error as Error).message };
  }
  port.postMessage(report);
});
