import { Command } from 'commander';
import { quietOnce } from '../loop/localClient.js';
import { rigAddress } from '../loop/rigLock.js';
import { readRig } from '../session/rig/readRig.js';
import { rigOption } from './arguments.js';

/** `lapwing quiet`: every output idle, now, with or without the web process. */
export function quietCommand(): Command {
  return new Command('quiet')
    .description('set every output of a running rig idle, and hold them; the record goes on')
    .addOption(rigOption())
    .action(async ({ rig }: { rig: string }) => {
      await quietOnce(rigAddress(readRig(rig).name));
      process.stdout.write('all outputs idle; stimulation and water are held\n');
    });
}
