import { resolve } from 'node:path';
import { Command } from 'commander';
import { readRig } from '../session/rig/readRig.js';
import { portOption, rigOption } from './arguments.js';
import { runLive } from './live.js';

interface ServeFlags {
  rig: string;
  port: number;
  rules?: string;
  records?: string;
  animals?: string;
}

/** `lapwing serve --rig RIG`: the page, from which sessions are begun and ended. */
export function serveCommand(): Command {
  return new Command('serve')
    .description('serve the page of a rig; sessions are begun and ended there')
    .addOption(rigOption())
    .addOption(portOption())
    .option('--rules <folder>', "instead of the rig file's rules folder")
    .option('--records <folder>', "instead of the rig file's record folder")
    .option('--animals <folder>', "instead of the rig file's animals folder")
    .action(async (flags: ServeFlags) => {
      await runLive({
        rig: readRig(flags.rig),
        rigPath: flags.rig,
        exitWhenEnded: false,
        web: { host: '127.0.0.1', port: flags.port },
        ...(flags.records === undefined ? {} : { recordFolder: resolve(flags.records) }),
        ...(flags.animals === undefined ? {} : { animalsFolder: resolve(flags.animals) }),
        ...(flags.rules === undefined ? {} : { rulesFolder: resolve(flags.rules) }),
      });
    });
}
