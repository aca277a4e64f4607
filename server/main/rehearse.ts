import { mkdtempSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join, resolve } from 'node:path';
import { Command, Option } from 'commander';
import { reportLines } from '../rehearse/reportLines.js';
import { newSeed, type PreparedRules, prepareRules } from '../session/prepare.js';
import { rehearse } from '../session/rehearsal.js';
import { readRig } from '../session/rig/readRig.js';
import type { Rig } from '../session/rig/rig.js';
import { openSession } from '../session/store.js';
import { type SessionSummary, Summariser, summaryLines } from '../session/summary.js';
import { rigOption, wholeNumber } from './arguments.js';
import { eventLine } from './eventLine.js';
import { addRunsOptions, animalOf, type RunsFlags, rehearseManyHere } from './rehearseRuns.js';
import { simulatedRigFor } from './simulatedRigFor.js';
import { tellWarnings } from './tellWarnings.js';

interface RehearseFlags extends RunsFlags {
  rig: string;
  animalSeed: number;
  runs?: number;
  events?: boolean;
  json?: boolean;
  record?: string | true;
}

const HELP = `
One session tells what fired where; --runs 500 tells how sessions differ: firings by rule and phase,
water, laps, which limits are met, rules that never fire and why, phases never left, errors of
position, balance of draws. The same --seed gives the same table on any number of cores.`;

/** `lapwing rehearse RULES --rig RIG`: a whole session in virtual time, as fast as it goes. */
export function rehearseCommand(): Command {
  const command = new Command('rehearse')
    .description('run a session on the simulated rig in virtual time, and tell what fired where')
    .argument('<rules>', 'the rules file')
    .addOption(rigOption())
    .option('--animal-seed <number>', 'which one of its kind', wholeNumber(0, 2 ** 31), 1)
    .option('--events', 'print every event')
    .option('--json', 'print the summary as JSON')
    .option('--record [folder]', 'write the record too, below this folder')
    .addOption(
      new Option('--runs <number>', 'this many sessions, and how they differ')
        .argParser(wholeNumber(1, 10_000))
        .conflicts(['events', 'record', 'animalSeed']),
    )
    .addHelpText('after', HELP)
    .action(async (path: string, flags: RehearseFlags) => {
      const rig = readRig(flags.rig);
      const rules = prepareRules(resolve(path), rig);
      if (!flags.json) tellWarnings(rules);
      if (flags.runs !== undefined) {
        const done = await rehearseManyHere(rig, rules, flags, flags.runs);
        if (done === undefined) return;
        const { report } = done;
        const text = flags.json ? JSON.stringify(report, null, 2) : reportLines(report).join('\n');
        process.stdout.write(`${text}\n`);
        return;
      }
      const summary = rehearseOnce(rig, rules, flags);
      if (flags.json) process.stdout.write(`${JSON.stringify(plain(summary), null, 2)}\n`);
      else process.stdout.write(`${summaryLines(summary).join('\n')}\n`);
    });
  return addRunsOptions(command);
}

function rehearseOnce(rig: Rig, rules: PreparedRules, flags: RehearseFlags): SessionSummary {
  const seed = flags.seed ?? newSeed();
  const setup = { rig, program: rules.program, title: rules.file.title, seed, waterTodayNl: 0 };
  const virtual = simulatedRigFor(rig, {
    ...{ seed: flags.animalSeed, trained: flags.naive !== true },
    animal: animalOf(flags).parameters,
  });
  const summariser = new Summariser(rules.file.rules.map(({ name }) => name.name));
  const opened = flags.record === undefined ? undefined : openFor(rig, rules, seed, flags.record);
  const runner = rehearse(setup, virtual, {
    mostUs: flags.most * 60_000_000,
    ...(opened === undefined ? {} : { recorder: opened.recorder }),
    onDecision: (decision) => {
      summariser.take(decision);
      const line = flags.events ? eventLine(decision) : undefined;
      if (line !== undefined) process.stdout.write(`${line}\n`);
    },
  });
  if (opened !== undefined) {
    opened.recorder.close(runner.core.endReason);
    process.stdout.write(`record: ${opened.folder}\n`);
  }
  if (!flags.json) process.stdout.write(`seed ${seed}, animal ${flags.animalSeed}\n`);
  return summariser.summary;
}

function openFor(rig: Rig, rules: PreparedRules, seed: string, where: string | true) {
  const root = where === true ? mkdtempSync(join(tmpdir(), 'lapwing-rehearsal-')) : resolve(where);
  const startedAt = new Date();
  const card = { subject: 'rehearsal', experimenter: '', seed, startedAt, waterTodayNl: 0 };
  return openSession(root, rig, rules, card, null, { mode: 'bulk' });
}

function plain(summary: SessionSummary): object {
  const rules = Object.fromEntries(
    [...summary.rules].map(([name, rule]) => [
      name,
      {
        fired: rule.fired,
        shams: rule.shams,
        not: Object.fromEntries(rule.not),
        armedErrorsMm: rule.armedErrorsMm,
        hostErrorsMm: rule.hostErrorsMm,
      },
    ]),
  );
  const { laps, licks, waterNl, endedBecause, sessionUs } = summary;
  return { sessionUs, laps, licks, waterUl: waterNl / 1_000, endedBecause, rules };
}
