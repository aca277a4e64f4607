import { resolve } from 'node:path';
import { Command } from 'commander';
import { prepareRules } from '../session/prepare.js';
import { readRig } from '../session/rig/readRig.js';
import { loginName, portOption, rigOption, wholeNumber } from './arguments.js';
import { foldersFor } from './builtInRigs.js';
import { runLive } from './live.js';
import { tellWarnings } from './tellWarnings.js';

interface RunFlags {
  rig: string;
  subject: string;
  experimenter: string;
  protocol?: string;
  sessionNumber?: number;
  seed?: string;
  records?: string;
  animals?: string;
  despite?: string;
  web?: boolean;
  port: number;
}

/** `lapwing run RULES --rig RIG`: one session, without a page unless asked for. */
export function runCommand(): Command {
  return new Command('run')
    .description('run one session in this terminal; Ctrl-C ends it, twice at once')
    .argument('<rules>', 'the rules file')
    .addOption(rigOption())
    .option('--subject <name>', 'the animal', 'nobody')
    .option('--experimenter <name>', 'who runs it', loginName())
    .option('--protocol <number>', 'number of the animal protocol under which it is done')
    .option(
      '--session-number <n>',
      "which session of the animal; else one more than its last one's",
      wholeNumber(1, 1_000_000),
    )
    .option('--seed <text>', 'the seed of every draw; made up and recorded where nothing is said')
    .option('--records <folder>', "instead of the rig file's record folder")
    .option('--animals <folder>', "instead of the rig file's animals folder")
    .option(
      '--despite <reason>',
      'begin though the animal was not weighed today, the pre-flight failed, or the like',
    )
    .option('--web', 'serve the page too')
    .addOption(portOption())
    .action(async (rules: string, flags: RunFlags) => {
      const rig = readRig(flags.rig);
      // Mistakes in the file are told before any process starts.
      tellWarnings(prepareRules(resolve(rules), rig));
      const { subject, experimenter, protocol, sessionNumber, seed, despite } = flags;
      const { records, animals } = { ...foldersFor(flags.rig), ...flags };
      await runLive({
        rig,
        rigPath: flags.rig,
        exitWhenEnded: true,
        begin: {
          ...{ rulesPath: resolve(rules), subject, experimenter },
          ...(protocol ? { protocolNumber: protocol } : {}),
          ...(sessionNumber === undefined ? {} : { sessionNumber }),
          ...(seed ? { seed } : {}),
          ...(despite ? { despite } : {}),
        },
        ...(animals === undefined ? {} : { animalsFolder: resolve(animals) }),
        ...(records === undefined ? {} : { recordFolder: resolve(records) }),
        ...(flags.web ? { web: { host: '127.0.0.1', port: flags.port } } : {}),
      });
    });
}
