import { resolve } from 'node:path';
import { Command } from 'commander';
import { LapwingError } from '../errors/codes.js';
import { explain } from '../rules/explain.js';
import { formatProblems } from '../rules/problems.js';
import { readRules } from '../session/prepare.js';
import { readRig } from '../session/rig/readRig.js';
import { factsOf } from '../session/rig/rig.js';

/** `lapwing explain RULES`: in plain words what a file will do, and the most that it ever can. */
export function explainCommand(): Command {
  return new Command('explain')
    .description('say in plain words what a rules file will do, and the most that it ever can')
    .argument('<rules>', 'the rules file')
    .option('--rig <file>', 'on this rig')
    .action((path: string, flags: { rig?: string }) => {
      const rig = flags.rig === undefined ? undefined : readRig(flags.rig);
      const { file, problems, sources } = readRules(resolve(path), rig);
      if (file === undefined) {
        const errors = problems.filter(({ severity }) => severity === 'error');
        throw new LapwingError('rulesInvalid', formatProblems(errors, sources));
      }
      process.stdout.write(`${explain(file, rig && factsOf(rig)).trimEnd()}\n`);
    });
}
