import { Command } from 'commander';
import { mend } from '../session/record/mend.js';
import { describeTroubles } from '../session/record/recordState.js';

/** `lapwing mend SESSION`: closes a record that was left open or torn. */
export function mendCommand(): Command {
  return new Command('mend')
    .description('close a record that a crash left open, and say what is missing')
    .argument('<session>', 'the session folder')
    .action(async (folder: string) => {
      const { state, bytes } = await mend(folder);
      const troubles = describeTroubles(state);
      const lines = [
        `${state.messages} messages up to input ${state.lastInput}, ${(bytes / 1e6).toFixed(1)} MB`,
        ...(troubles.length === 0 ? ['nothing is missing'] : troubles),
      ];
      process.stdout.write(`${lines.join('\n')}\n`);
    });
}
