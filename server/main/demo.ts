import { homedir } from 'node:os';
import { join } from 'node:path';
import { Command } from 'commander';
import { packageRoot } from '../packageRoot.js';
import { readRig } from '../session/rig/readRig.js';
import { portOption } from './arguments.js';
import { runLive } from './live.js';

/** `lapwing demo`: the simulated rig, a trained animal and the demo's rules, with the page. */
export function demoCommand(): Command {
  return new Command('demo')
    .description('run the simulated rig with the demo rules and serve its page')
    .addOption(portOption())
    .option('--records <folder>', 'where the record goes', join(homedir(), 'lapwing-demo-records'))
    .option('--seed <number>', 'of the simulated animal', '1')
    .action(async (flags: { port: number; records: string; seed: string }) => {
      const folder = join(packageRoot, 'hardware-sim/demo');
      const rigPath = join(folder, 'rig.yaml');
      await runLive({
        rig: readRig(rigPath),
        rigPath,
        exitWhenEnded: false,
        recordFolder: flags.records,
        begin: {
          rulesPath: join(folder, 'sessions/demo.yaml'),
          subject: 'sim1',
          experimenter: 'demo',
        },
        web: { host: '127.0.0.1', port: flags.port },
        simulatedRig: ['--seed', flags.seed, '--trained'],
        hello: (url) =>
          `The simulated rig runs, and so does the demo session. Open ${url}\n` +
          'Lapwing is not a safety interlock. With an animal: local rules, the approved protocol and trained staff decide.\n' +
          `Records go to ${flags.records}. Ctrl-C ends the session, and a second one at once.`,
      });
    });
}
