import { mkdtempSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join, resolve } from 'node:path';
import { Command } from 'commander';
import { newSeed, type PreparedRules, prepareRules } from '../session/prepare.js';
import { rehearse } from '../session/rehearsal.js';
import { readRig } from '../session/rig/readRig.js';
import type { Rig } from '../session/rig/rig.js';
import { openSession } from '../session/store.js';
import { type SessionSummary, Summariser, summaryLines } from '../session/summary.js';
import { rigOption, wholeNumber } from './arguments.js';
import { eventLine } from './eventLine.js';
import { simulatedRigFor } from './simulatedRigFor.js';
import { tellWarnings } from './tellWarnings.js';

interface RehearseFlags {
  rig: string;
  seed?: string;
  animal: number;
  naive?: boolean;
  most: number;
  events?: boolean;
  json?: boolean;
  record?: string | true;
}

/** `lapwing rehearse RULES --rig RIG`: a whole session in virtual time, as fast as it goes. */
export function rehearseCommand(): Command {
  return new Command('rehearse')
    .description('run a session on the simulated rig in virtual time, and tell what fired where')
    .argument('<rules>', 'the rules file')
    .addOption(rigOption())
    .option('--seed <text>', 'the seed of every draw')
    .option('--animal <number>', 'the seed of the simulated animal', wholeNumber(0, 2 ** 31), 1)
    .option('--naive', 'an animal that has not learned where water comes')
    .option('--most <minutes>', 'end after this long at most', wholeNumber(1, 24 * 60), 180)
    .option('--events', 'print every event')
    .option('--json', 'print the summary as JSON')
    .option('--record [folder]', 'write the record too, below this folder')
    .action((path: string, flags: RehearseFlags) => {
      const rig = readRig(flags.rig);
      const rules = prepareRules(resolve(path), rig);
      if (!flags.json) tellWarnings(rules);
      const summary = rehearseOnce(rig, rules, flags);
      if (flags.json) process.stdout.write(`${JSON.stringify(plain(summary), null, 2)}\n`);
      else process.stdout.write(`${summaryLines(summary).join('\n')}\n`);
    });
}

function rehearseOnce(rig: Rig, rules: PreparedRules, flags: RehearseFlags): SessionSummary {
  const seed = flags.seed ?? newSeed();
  const setup = { rig, program: rules.program, title: rules.file.title, seed, waterTodayNl: 0 };
  const virtual = simulatedRigFor(rig, { seed: flags.animal, trained: flags.naive !== true });
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
  if (!flags.json) process.stdout.write(`seed ${seed}, animal ${flags.animal}\n`);
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
