import { resolve } from 'node:path';
import { Command, InvalidArgumentError, Option } from 'commander';
import { planPower } from '../plan/lickSharePlan.js';
import { planLines } from '../plan/planLines.js';
import type { Design } from '../plan/power.js';
import { murmur3 } from '../rules/engine/hash.js';
import { prepareRules } from '../session/prepare.js';
import { readRig } from '../session/rig/readRig.js';
import { rigOption, wholeNumber } from './arguments.js';
import { addRunsOptions, type RunsFlags, rehearseManyHere } from './rehearseRuns.js';
import { tellWarnings } from './tellWarnings.js';

interface PowerFlags extends RunsFlags {
  rig: string;
  difference: number;
  design: Design;
  laps: number[];
  power: number;
  alpha: number;
  runs: number;
  json?: boolean;
}

const HELP = `
Rehearses the rules with many simulated animals, then runs experiments on them, each tested with one
number from each animal. Fit the animal to your own sessions first: \`lapwing animal fit\`.`;

/** `lapwing plan power RULES --rig RIG --difference 10%`: how many animals, over how many laps. */
export function planCommand(): Command {
  return new Command('plan')
    .description('plan an experiment from rehearsals')
    .addCommand(powerCommand());
}

function powerCommand(): Command {
  const command = new Command('power')
    .description('how many animals and laps it takes to find a difference in lick share')
    .argument('<rules>', 'the rules file')
    .addOption(rigOption())
    .requiredOption('--difference <share>', 'in lick share, such as 10%', share(0.001, 1))
    .addOption(
      new Option('--design <design>', 'two groups of animals, or each under both conditions')
        .choices(['between', 'within'])
        .default('between'),
    )
    .option(
      '--laps <numbers>',
      'of each animal under each condition',
      lapNumbers,
      [10, 25, 50, 100],
    )
    .option('--power <share>', 'the power wanted', share(0.5, 0.99), 0.8)
    .option('--alpha <share>', 'two-sided', share(0.001, 0.2), 0.05)
    .option('--runs <number>', 'animals to rehearse', wholeNumber(20, 10_000), 200)
    .option('--json', 'print the plan as JSON')
    .addHelpText('after', HELP)
    .action(async (path: string, flags: PowerFlags) => {
      const rig = readRig(flags.rig);
      const rules = prepareRules(resolve(path), rig);
      if (!flags.json) tellWarnings(rules);
      const done = await rehearseManyHere(rig, rules, flags, flags.runs);
      if (done === undefined) return;
      const { design, difference, alpha, power, laps } = flags;
      const seed = murmur3(done.report.seed, 0x706f);
      const plan = planPower(
        done.results.map(({ lapLicks }) => lapLicks),
        { design, difference, alpha, power, laps, seed },
      );
      const text = flags.json
        ? JSON.stringify({ ...plan, seed: done.report.seed, animal: done.report.animal }, null, 2)
        : planLines(plan, done.report).join('\n');
      process.stdout.write(`${text}\n`);
    });
  return addRunsOptions(command);
}

/** `10%`, `10 %` or `0.1`. */
function share(least: number, most: number): (text: string) => number {
  return (text) => {
    const found = /^(\d*\.?\d+) ?(%?)$/.exec(text.trim());
    const value = found === null ? Number.NaN : Number(found[1]) / (found[2] === '%' ? 100 : 1);
    if (value >= least && value <= most) return value;
    throw new InvalidArgumentError(`expected a share from ${least * 100}% to ${most * 100}%`);
  };
}

function lapNumbers(text: string): number[] {
  const one = wholeNumber(1, 10_000);
  return text.split(',').map((part) => one(part.trim()));
}
