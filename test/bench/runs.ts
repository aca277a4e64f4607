import { join } from 'node:path';
import { ANIMAL } from '../../hardware-sim/animal/parameters.js';
import { runAll } from '../../server/main/runsPool.js';
import { packageRoot } from '../../server/packageRoot.js';
import { DEFAULT_LATENCY } from '../../server/rehearse/latency.js';
import { runsReport } from '../../server/rehearse/runsReport.js';
import { checkText } from '../../server/rules/readRules.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { factsOf } from '../../server/session/rig/rig.js';
import { TEN_RULES } from './rehearsal.js';

export const RUNS = 500;
const JOBS = 2;

export interface RunsBench {
  readonly runs: number;
  readonly jobs: number;
  readonly sessionMin: number;
  readonly tookS: number;
  /** Processor time of all threads; more than `tookS` when the cores were free. */
  readonly cpuS: number;
}

/** Sessions of 45 minutes with ten rules on two threads, and the report on them. */
export async function benchRuns(): Promise<RunsBench> {
  const rig = readRig(join(packageRoot, 'hardware-sim/demo/rig.yaml'));
  const text = TEN_RULES.replace('time >= 60 min', 'time >= 45 min');
  const { file } = checkText('rules.yaml', text, factsOf(rig));
  const setting = {
    ...{ rig, file: file!, seed: 'bench', animal: ANIMAL, trained: true, minutes: 60 },
    ...{ everyFrame: false, latency: DEFAULT_LATENCY },
  };
  const before = process.cpuUsage();
  const beganMs = performance.now();
  const results = await runAll(setting, RUNS, { jobs: JOBS });
  const circumstances = { seed: 'bench', animal: 'usual', latency: '', notes: [] };
  const report = runsReport(file!, results, circumstances);
  const tookS = (performance.now() - beganMs) / 1000;
  const { user, system } = process.cpuUsage(before);
  return {
    ...{ runs: RUNS, jobs: JOBS, sessionMin: report.minutes.median },
    ...{ tookS, cpuS: (user + system) / 1e6 },
  };
}
