/**
 * The process in which the page's rehearsals run: forked by the web process, told one task, gone
 * when it is done. A rehearsal takes a whole core for seconds; neither the loop nor the web process
 * may wait for that.
 */
import { availableParallelism, setPriority } from 'node:os';
import { fileURLToPath } from 'node:url';
import { ANIMAL } from '../../hardware-sim/animal/parameters.js';
import { LapwingError } from '../errors/codes.js';
import { DEFAULT_LATENCY } from '../rehearse/latency.js';
import type { RulesFile } from '../rules/ast.js';
import { compile } from '../rules/engine/compile.js';
import { formatProblems } from '../rules/problems.js';
import type { StampedDecision } from '../session/decisions.js';
import { newSeed } from '../session/prepare.js';
import { rehearse } from '../session/rehearsal.js';
import { readRig } from '../session/rig/readRig.js';
import { factsOf, type Rig } from '../session/rig/rig.js';
import { type RuleSummary, Summariser } from '../session/summary.js';
import { RasterCollector } from '../web/rehearsal/raster.js';
import type { RehearsalReport, RehearsalTask } from '../web/rehearsal/rehearsalMessages.js';
import { checkRulesText } from '../web/rules/checkAnswer.js';
import { RulesFolder } from '../web/rules/rulesFolder.js';
import type { ManyResult, RehearsalResult, RehearsedRule } from '../web/rules/rulesMessages.js';
import { rehearseMany } from './rehearseRuns.js';
import { simulatedRigFor } from './simulatedRigFor.js';

interface Prepared {
  readonly rig: Rig;
  readonly file: RulesFile;
  readonly seed: string;
}

/** @throws LapwingError RULES_INVALID, RIG_INVALID */
function prepare(task: RehearsalTask): Prepared {
  const rig = readRig(task.rigPath);
  const folder = new RulesFolder(task.rulesFolder);
  const checked = checkRulesText(folder, task.path, task.text, factsOf(rig));
  const { file, problems, sources } = checked;
  if (file === undefined) {
    const errors = problems.filter(({ severity }) => severity === 'error');
    throw new LapwingError('rulesInvalid', formatProblems(errors, sources));
  }
  return { rig, file, seed: task.seed === '' ? newSeed() : task.seed };
}

/**
 * Rehearses a text on the simulated rig.
 * @param progress called about every virtual minute, with seconds of session
 * @throws LapwingError RULES_INVALID, RIG_INVALID
 */
export function rehearseText(
  task: RehearsalTask,
  progress: (sessionS: number) => void = () => {},
): RehearsalResult {
  const beganMs = performance.now();
  const { rig, file, seed } = prepare(task);
  const setup = {
    ...{ rig, program: compile(file, factsOf(rig)), title: file.title, seed, waterTodayNl: 0 },
  };
  const summariser = new Summariser(file.rules.map(({ name }) => name.name));
  const raster = new RasterCollector(rig.outputs);
  const phases: { name: string; lap: number; s: number }[] = [];
  let beganUs = 0;
  const take = (decision: StampedDecision): void => {
    summariser.take(decision);
    raster.take(decision);
    if (decision.kind === 'session began') beganUs = decision.boardUs;
    if (decision.kind !== 'phase began' || phases.length >= 1_000) return;
    const s = (decision.boardUs - beganUs) / 1_000_000;
    phases.push({ name: decision.phase, lap: decision.lap, s });
  };
  const animal = { seed: task.animalSeed, trained: task.trained };
  rehearse(setup, simulatedRigFor(rig, animal), {
    mostUs: task.minutes * 60_000_000,
    onDecision: take,
    progress: (us) => {
      progress(us / 1_000_000);
      return false;
    },
  });
  const { rules, laps, licks, waterNl, endedBecause, sessionUs } = summariser.summary;
  return {
    ...{ seed, laps, licks, endedBecause, phases, raster: raster.result },
    sessionS: sessionUs / 1_000_000,
    waterUl: waterNl / 1_000,
    tookS: (performance.now() - beganMs) / 1_000,
    rules: [...rules].map(([name, rule]) => told(name, rule)),
    beltCm: rig.belt.lengthCm,
    marksLeftOut: raster.leftOut,
  };
}

/** Rehearses a text many times, on all cores but one. @param progress called with the runs done */
async function rehearseOften(
  task: RehearsalTask,
  progress: (runs: number) => void,
): Promise<ManyResult> {
  const beganMs = performance.now();
  const { runs, trained, minutes } = task;
  const setting = {
    ...{ ...prepare(task), animal: ANIMAL, trained, minutes },
    ...{ everyFrame: false, latency: DEFAULT_LATENCY },
  };
  const { report } = await rehearseMany(setting, runs, 'usual', {
    jobs: Math.max(1, availableParallelism() - 1),
    progress: (share) => progress(Math.round(share * runs)),
  });
  return { report, tookS: (performance.now() - beganMs) / 1_000 };
}

function told(name: string, rule: RuleSummary): RehearsedRule {
  const errors = [...rule.armedErrorsMm, ...rule.hostErrorsMm].map(Math.abs).sort((a, b) => a - b);
  return {
    name,
    fired: rule.fired,
    shams: rule.shams,
    not: [...rule.not].map(([why, times]) => ({ why, times })),
    medianErrorMm: errors[Math.floor(errors.length / 2)] ?? null,
    worstErrorMm: errors.at(-1) ?? null,
  };
}

async function serveOne(task: RehearsalTask): Promise<void> {
  const parent = process.ppid;
  const say = (report: RehearsalReport): void => {
    // Whoever asked is gone: nobody would read the result.
    if (process.ppid !== parent) process.exit(1);
    process.send!(report);
  };
  try {
    if (task.runs > 1) {
      const result = await rehearseOften(task, (done) => say({ report: 'runs', done }));
      say({ report: 'many done', result });
    } else {
      const result = rehearseText(task, (sessionS) => say({ report: 'progress', sessionS }));
      say({ report: 'done', result });
    }
  } catch (error) {
    const { code = 'WEB_INTERNAL', message, remedy = '' } = error as Partial<LapwingError> & Error;
    say({ report: 'failed', code, detail: message, remedy });
  }
  process.disconnect();
}

if (process.argv[1] === fileURLToPath(import.meta.url) && process.send) {
  // A live session on the same machine comes first.
  setPriority(10);
  process.once('message', (task) => void serveOne(task as RehearsalTask));
}
