import { resolve } from 'node:path';
import { Command } from 'commander';
import { readRig } from '../session/rig/readRig.js';
import { portOption, rigOption } from './arguments.js';
import { runLive } from './live.js';

interface ResumeFlags {
  rig: string;
  records?: string;
  web?: boolean;
  port: number;
}

/** `lapwing resume --rig RIG`: goes on with the session that a crash or a power cut left. */
export function resumeCommand(): Command {
  return new Command('resume')
    .description('go on with a session that was left unfinished on this rig')
    .addOption(rigOption())
    .option('--records <folder>', "instead of the rig file's record folder")
    .option('--web', 'serve the page too')
    .addOption(portOption())
    .action(async (flags: ResumeFlags) => {
      await runLive({
        rig: readRig(flags.rig),
        rigPath: flags.rig,
        exitWhenEnded: true,
        resume: true,
        ...(flags.records === undefined ? {} : { recordFolder: resolve(flags.records) }),
        ...(flags.web ? { web: { host: '127.0.0.1', port: flags.port } } : {}),
      });
    });
}
