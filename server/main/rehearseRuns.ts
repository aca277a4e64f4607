import { setPriority } from 'node:os';
import type { Command } from 'commander';
import { ANIMAL } from '../../hardware-sim/animal/parameters.js';
import { type AnimalFile, readAnimal } from '../rehearse/animalFile.js';
import { DEFAULT_LATENCY, readLatency } from '../rehearse/latency.js';
import { runsNotes } from '../rehearse/notes.js';
import type { RunResult } from '../rehearse/runResult.js';
import { type RunsReport, runsReport } from '../rehearse/runsReport.js';
import { newSeed, type PreparedRules } from '../session/prepare.js';
import type { Rig } from '../session/rig/rig.js';
import { wholeNumber } from './arguments.js';
import { progressBar } from './progressBar.js';
import type { RunsSetting } from './runOnce.js';
import { type PoolOptions, runAll } from './runsPool.js';

/** What the commands that rehearse many sessions have in common. */
export interface RunsFlags {
  seed?: string;
  animal?: string;
  naive?: boolean;
  most: number;
  jobs?: number;
  latency?: string;
  everyFrame?: boolean;
}

export function addRunsOptions(command: Command): Command {
  return command
    .option('--seed <text>', 'the seed of every draw, and with --runs of every animal')
    .option('--animal <file>', 'how the simulated animal behaves; see `lapwing animal`')
    .option('--naive', 'an animal that has not learned where water comes')
    .option('--most <minutes>', 'end after this long at most', wholeNumber(1, 24 * 60), 180)
    .option(
      '--jobs <number>',
      'many sessions on so many cores; all unless said',
      wholeNumber(1, 256),
    )
    .option('--latency <file>', 'latencies as measured, for errors of position in many sessions')
    .option('--every-frame', 'many sessions with every frame of a board at 1 kHz: far slower');
}

/** The animal that `--animal` describes; the usual one without it. */
export function animalOf({ animal }: RunsFlags): AnimalFile {
  return animal === undefined ? { name: 'usual', parameters: ANIMAL } : readAnimal(animal);
}

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
  const { file, seed, latency, everyFrame, trained, minutes } = setting;
  const report = runsReport(file, results, {
    ...{ seed, latency: latency.words, animal: `${animal}, ${trained ? 'trained' : 'naive'}` },
    notes: runsNotes(file, { everyFrame, minutes }),
  });
  return { results, report };
}

/**
 * The same at a terminal, by a command's flags: with a bar, and Ctrl-C ends it.
 * @returns undefined when it was ended: nothing is to be told
 */
export async function rehearseManyHere(
  rig: Rig,
  rules: PreparedRules,
  flags: RunsFlags,
  runs: number,
): Promise<RunsDone | undefined> {
  const { name, parameters } = animalOf(flags);
  const setting: RunsSetting = {
    ...{ rig, file: rules.file, seed: flags.seed ?? newSeed(), animal: parameters },
    ...{ trained: flags.naive !== true, minutes: flags.most },
    everyFrame: flags.everyFrame === true,
    latency: flags.latency === undefined ? DEFAULT_LATENCY : readLatency(flags.latency),
  };
  // A live session on the same machine comes first.
  setPriority(10);
  const bar = progressBar(`rehearsing ${runs} sessions`);
  const aborter = new AbortController();
  const stop = () => aborter.abort(CANCELLED);
  process.once('SIGINT', stop);
  try {
    return await rehearseMany(setting, runs, name, {
      ...(flags.jobs === undefined ? {} : { jobs: flags.jobs }),
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
