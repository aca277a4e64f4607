import { setPriority } from 'node:os';
import { runsNotes } from '../rehearse/notes.js';
import type { RunResult } from '../rehearse/runResult.js';
import { type RunsReport, runsReport } from '../rehearse/runsReport.js';
import type { RulesFile } from '../rules/ast.js';
import { progressBar } from './progressBar.js';
import type { RunsSetting } from './runOnce.js';
import { type PoolOptions, runAll } from './runsPool.js';

export interface RunsDone {
  readonly results: readonly RunResult[];
  readonly report: RunsReport;
}

/** Rehearses many sessions of one setting and reports on them. @param animal what it is called */
export async function rehearseMany(
  setting: RunsSetting,
  runs: number,
  animal: string,
  options: PoolOptions = {},
): Promise<RunsDone> {
  const results = await runAll(setting, runs, options);
  return { results, report: reportOn(setting.file, setting, results, animal) };
}

function reportOn(
  file: RulesFile,
  { seed, latency, everyFrame, trained, minutes }: RunsSetting,
  results: readonly RunResult[],
  animal: string,
): RunsReport {
  const circumstances = {
    ...{ seed, latency: latency.words, animal: `${animal}, ${trained ? 'trained' : 'naive'}` },
    notes: runsNotes(file, { everyFrame, minutes }),
  };
  return runsReport(file, results, circumstances);
}

/** The same at a terminal: a bar, and Ctrl-C ends it with nothing told. */
export async function rehearseManyHere(
  setting: RunsSetting,
  runs: number,
  animal: string,
  jobs: number | undefined,
): Promise<RunsDone | undefined> {
  // A live session on the same machine comes first.
  setPriority(10);
  const bar = progressBar(`rehearsing ${runs} sessions`);
  const aborter = new AbortController();
  const stop = () => aborter.abort(CANCELLED);
  process.once('SIGINT', stop);
  try {
    return await rehearseMany(setting, runs, animal, {
      ...(jobs === undefined ? {} : { jobs }),
      progress: (done) => bar.show(done),
      signal: aborter.signal,
    });
  } catch (error) {
    if (error !== CANCELLED) throw error;
    process.exitCode = 130;
    return undefined;
  } finally {
    bar.clear();
    process.off('SIGINT', stop);
    if (aborter.signal.aborted) process.stderr.write('cancelled\n');
  }
}
const CANCELLED = new Error('cancelled');
