import { Command } from 'commander';
import { factsOf, runPreflight } from '../calibrate/preflight/preflight.js';
import type { Preflight } from '../session/preflight.js';
import { readRig } from '../session/rig/readRig.js';
import { answersOption, loginName, rigOption } from './arguments.js';
import { TerminalDesk } from './terminalDesk.js';
import { withBench } from './withBench.js';

interface Flags {
  rig: string;
  by: string;
  answer: Record<string, string>;
  yes?: boolean;
  json?: boolean;
}

const MARKS = {
  passed: 'ok  ',
  failed: 'FAIL',
  overridden: 'over',
  'not possible': '--  ',
} as const;

/** `lapwing preflight`: a minute before a session, recorded; leaves with 1 when something failed. */
export function preflightCommand(): Command {
  return new Command('preflight')
    .description('check the rig before a session; the next session keeps a copy of the result')
    .addOption(rigOption())
    .option('--by <name>', 'who checks', loginName())
    .addOption(answersOption("lap='go on all the same' lap-reason='belt is new'"))
    .option('--yes', 'ask nothing and take what is offered; what fails stays failed')
    .option('--json', 'print the result as JSON')
    .action(async (flags: Flags) => {
      const rig = readRig(flags.rig);
      const preflight = await withBench(rig, flags.rig, ({ bench, hands, signal }) => {
        const desk = new TerminalDesk({
          ...{ rig, bench, signal, hands: hands?.say, by: flags.by, given: flags.answer },
          ...{ yes: flags.yes === true, silent: flags.json === true },
        });
        return runPreflight(desk, factsOf(rig));
      });
      if (!preflight.passed) process.exitCode = 1;
      const text = flags.json ? JSON.stringify(preflight, null, 2) : inWords(preflight);
      process.stdout.write(`${text}\n`);
    });
}

function inWords({ passed, checks }: Preflight): string {
  const lines = checks.flatMap(({ title, result, detail, remedy, reason }) => [
    `${MARKS[result]} ${title}: ${detail}`,
    ...(reason === undefined ? [] : [`       overridden: ${reason}`]),
    ...(remedy === '' || result === 'passed' ? [] : [`       ${remedy}`]),
  ]);
  return [...lines, passed ? 'ready' : 'not ready'].join('\n');
}
