import { constants, setPriority } from 'node:os';
import type { LapwingError } from '../../errors/codes.js';
import type { JobReport } from './jobMessages.js';

/** Told the share done, 0 to 1, and what is being done, in a word or two. */
export type Tell = (done: number, doing: string) => void;

/** A share is told this often at most: who follows asks a few times a second. */
const TELL_EVERY_MS = 100;

/**
 * The whole of a job's process: takes one task from the process that forked it (`Jobs`), works, says
 * what came of it, and leaves. It goes as well when that process does.
 */
export function serveJob<Task>(work: (task: Task, tell: Tell) => unknown): void {
  try {
    // A live session on the same machine comes first.
    setPriority(constants.priority.PRIORITY_BELOW_NORMAL);
  } catch {
    // It works at the usual priority then.
  }
  const parent = process.ppid;
  const say = (report: JobReport): void => void process.send?.(report);
  let toldMs = Number.NEGATIVE_INFINITY;
  const tell: Tell = (done, doing) => {
    // Whoever asked is gone: nobody would read the result.
    if (process.ppid !== parent) process.exit(1);
    const nowMs = performance.now();
    if (nowMs - toldMs < TELL_EVERY_MS) return;
    toldMs = nowMs;
    say({ report: 'progress', done: Math.min(1, Math.max(0, done)), doing });
  };
  process.once('disconnect', () => process.exit(1));
  process.once('message', async (task) => {
    try {
      say({ report: 'done', result: await work(task as Task, tell) });
    } catch (error) {
      const {
        code = 'WEB_INTERNAL',
        message,
        remedy = '',
      } = error as Partial<LapwingError> & Error;
      say({ report: 'failed', code, detail: message, remedy });
    }
    process.removeAllListeners('disconnect');
    process.disconnect?.();
  });
}
