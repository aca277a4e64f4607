import { type ChildProcess, fork } from 'node:child_process';
import { copyFileSync, mkdirSync } from 'node:fs';
import { homedir } from 'node:os';
import { join, resolve } from 'node:path';
import { Command } from 'commander';
import { compiledScript } from '../askChild.js';
import { packageRoot } from '../packageRoot.js';
import { readRig } from '../session/rig/readRig.js';
import { keepDemoAnimals } from './animals/demoAnimals.js';
import { portOption } from './arguments.js';
import { wantsDemoSessions } from './demoSessions.js';
import { runLive } from './live.js';

interface DemoFlags {
  readonly port: number;
  readonly records: string;
  readonly animals?: string;
  readonly seed: string;
  readonly earlier: boolean;
}

/** `lapwing demo`: the simulated rig, a trained animal and the demo's rules, with the page. */
export function demoCommand(): Command {
  return new Command('demo')
    .description('run the simulated rig with the demo rules and serve its page')
    .addOption(portOption())
    .option('--records <folder>', 'where the record goes', join(homedir(), 'lapwing-demo-records'))
    .option('--animals <folder>', 'where its animals are kept; beside the records')
    .option('--seed <number>', 'of the simulated animal', '1')
    .option('--no-earlier', 'make no earlier sessions for an empty records folder')
    .action(async (flags: DemoFlags) => {
      const folder = join(packageRoot, 'hardware-sim/demo');
      const rigPath = ownRig(join(folder, 'rig.yaml'), `${resolve(flags.records)}-rig`);
      // Looked at before the demo's own session has a folder.
      const newcomer = flags.earlier && wantsDemoSessions(flags.records);
      const animalsFolder = resolve(flags.animals ?? `${flags.records}-animals`);
      await keepDemoAnimals(animalsFolder);
      let making: ChildProcess | undefined;
      await runLive({
        rig: readRig(rigPath),
        rigPath,
        exitWhenEnded: false,
        recordFolder: flags.records,
        rulesFolder: join(folder, 'sessions'),
        animalsFolder,
        begin: {
          rulesPath: join(folder, 'sessions/demo.yaml'),
          subject: 'sim1',
          experimenter: 'demo',
        },
        web: { host: '127.0.0.1', port: flags.port },
        simulatedRig: ['--seed', flags.seed, '--trained'],
        hello: (url) => {
          if (newcomer) making ??= makeDemoSessions(flags.records, rigPath);
          return (
            `The simulated rig runs, and so does the demo session. Open ${url}\n` +
            'Lapwing is not a safety interlock. With an animal: local rules, the approved protocol and trained staff decide.\n' +
            `Records go to ${flags.records}. Ctrl-C ends the session, and a second one at once.`
          );
        },
      }).finally(() => making?.kill());
    });
}

/**
 * The demo's own copy of its rig file, beside the records: calibrations are kept there and put in
 * force. A copy that is there already is used as it stands, unless it is no rig file any more.
 */
function ownRig(from: string, folder: string): string {
  const own = join(folder, 'rig.yaml');
  try {
    readRig(own);
  } catch {
    mkdirSync(folder, { recursive: true });
    copyFileSync(from, own);
  }
  return own;
}

/** Earlier sessions to look at, in a process of their own that goes when it is done. */
function makeDemoSessions(records: string, rigPath: string): ChildProcess {
  const script = compiledScript(import.meta.url, './demoSessions.js');
  return fork(script, [records, rigPath], { stdio: ['ignore', 'ignore', 'inherit', 'ipc'] });
}
